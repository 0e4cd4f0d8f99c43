//! `check`: every problem, with its place in the file.

use crate::{Folder, RECTANGLE, shapes};

#[test]
fn every_problem_is_listed_with_loop_vertex_and_remedy() {
    let folder = Folder::with(
        "a.csv",
        "x_um,y_um,loop\n\
         40,10,a\nnan,10,a\n60,30,a\n\
         0,0,b\n100,0,b\n100,inf,b\n0,50,b\n0,50,b\n\
         200,0,c\n300,100,c\n300,0,c\n200,100,c\n\
         400,0,d\n500,0,d\n\
         600,0,e\n700,0,e\n800,0,e\n\
         900,0,f\n1000,0,f\n1000,50,f\n950,50,f\n950,90,f\n950,50,f\n900,50,f\n",
    );
    let run = folder.line("check a.csv");
    assert_eq!(run.status, 1, "{}", run.err);
    for part in [
        "vertex 2 at (NaN, 10) um is not finite (loop 1 of the file)",
        "vertex 3 at (100, inf) um is not finite (loop 2 of the file)",
        "harmless: ",
        "vertex 5 at (0, 50) um repeats vertex 4 (loop 2 of the file)",
        "crosses the edge from vertex 1 at (250, 50) um (loop 3 of the file)",
        "2 different vertices in a row, at least 3 are needed (loop 4 of the file)",
        "the area is zero (loop 5 of the file)",
        "doubles back over itself at vertex 5 at (950, 90) um (loop 6 of the file)",
    ] {
        assert!(run.out.contains(part), "{part}\n{}", run.out);
    }
    let problems = run.out.matches("problem: ").count() + run.out.matches("harmless: ").count();
    assert_eq!(problems, run.out.matches("  help: ").count());
    // Solving stops at the first, at its place in the file.
    folder
        .line("solve a.csv")
        .assert_error(3, &["`nan` is not a finite number", "--> a.csv:3:1"]);
}

#[test]
fn vertices_of_section_files_that_are_not_finite_are_listed_too() {
    let folder = Folder::with(
        "a.toml",
        "unit = \"um\"\n[[lumen]]\nouter = [[0, 0], [nan, 0], [100, -inf], [1e999, \"1e999 um\"]]\n",
    );
    let run = folder.line("check a.toml");
    assert_eq!(run.status, 1, "{}", run.err);
    assert_eq!(run.out.matches("is not finite").count(), 3, "{}", run.out);
    folder
        .line("solve a.toml")
        .assert_error(3, &["lumen 1, outer, vertex 2", "`nan`", "--> a.toml:3:19"]);
}

#[test]
fn containment_is_judged() {
    for (file, part) in [
        (
            "[[lumen]]\nouter=[[0,0],[9,0],[9,9],[0,9]]\n[[lumen]]\nouter=[[2,2],[4,2],[4,4]]\n",
            "lies in the fluid of lumen 1",
        ),
        (
            "[[lumen]]\nouter=[[0,0],[9,0],[9,9]]\nislands=[[[20,20],[21,20],[21,21]]]\n",
            "lies outside",
        ),
        (
            "[[lumen]]\nouter=[[0,0],[9,0],[9,9]]\nislands=[[[5,2],[12,2],[12,3]]]\n",
            "crosses",
        ),
    ] {
        let folder = Folder::with("a.toml", format!("unit=\"um\"\n{file}"));
        let run = folder.line("check a.toml");
        assert_eq!(run.status, 1);
        assert!(run.out.contains(part), "{}", run.out);
    }
}

#[test]
fn machine_output_counts_loops_as_the_file_does() {
    let island_first = "x_um,y_um\n40,20\n60,20\n60,20\n60,30\n\n0,0\n100,0\n100,50\n0,50\n";
    let folder = Folder::with("a.csv", island_first);
    let record = folder.json("check a.csv --json");
    assert_eq!(record["schema"], "etchwise-check/1");
    assert_eq!(record["accepted"], true);
    assert_eq!(record["vertices"], 8);
    let problem = &record["problems"][0];
    assert_eq!(problem["kind"], "duplicate_vertex");
    assert_eq!(problem["wall"], "island 1 of lumen 1");
    assert_eq!(
        (problem["loop"].as_u64(), problem["vertex"].as_u64()),
        (Some(0), Some(2))
    );
    assert_eq!(problem["at"].as_array().unwrap().len(), 2);
    let folder = Folder::with("a.csv", "x_um,y_um\n0,0\nnan,0\n100,50\n");
    let run = folder.line("check a.csv --json");
    assert_eq!(run.status, 1);
    let record: serde_json::Value = serde_json::from_str(&run.out).unwrap();
    let problems = record["problems"].as_array().unwrap();
    let lost = problems.iter().find(|p| p["kind"] == "non_finite_vertex");
    assert!(lost.unwrap()["at"].is_null());
    assert!(problems.iter().any(|p| p["kind"] == "too_few_vertices"));
}

#[test]
fn sound_outlines_pass() {
    let run = Folder::with("a.csv", RECTANGLE).line("check a.csv");
    assert_eq!(run.out, "a.csv: no problems in 4 vertices\n");
    let folder = Folder::new();
    for path in shapes() {
        let run = folder.run(&["check", &path.to_string_lossy()]);
        assert_eq!(run.status, 0, "{}: {}{}", path.display(), run.out, run.err);
    }
}
