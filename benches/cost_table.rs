//! What a solve costs, as tables: by stage per fluid node, to a given accuracy, on one thread and two.
//!
//! `cargo bench --bench cost_table` prints them, medians of several runs, in some minutes; with
//! `-- quick` the largest grids are left out. Memory and allocations are counted, not timed. The first lines say what
//! this machine copies a second, so that bytes moved can be set against it.

#![expect(clippy::print_stdout, reason = "the tables are the result")]

use std::error::Error;
use std::path::Path;
use std::time::Instant;

use etchwise::flow::{Goal, NearbySections, SolveOptions, SolvedSection, solve_outline};
use etchwise::geometry::Outline;
use etchwise::intake::{ReadOptions, read_section};

/// Runs of which the median is printed.
const RUNS: usize = 5;
/// Fluid nodes above which a case is run once only.
const LARGE: usize = 5_000_000;

/// Cells across of the grid that the error of `K` alone is measured against.
const REFERENCE_CELLS: f64 = 1500.0;

type Fallible<T> = Result<T, Box<dyn Error>>;

fn shipped(file: &str) -> Fallible<Outline> {
    let shapes = concat!(env!("CARGO_MANIFEST_DIR"), "/shapes");
    Ok(read_section(&Path::new(shapes).join(file), &ReadOptions::default())?.outline)
}

/// A disc with a rough wall of a thousand vertices, as a profilometer would give it; invented.
fn rough() -> Outline {
    let radius = |t: f64| {
        let waves = (7.0 * t).sin() + 0.6 * (41.0 * t + 1.0).sin() + 0.5 * (173.0 * t + 2.0).sin();
        50e-6 * (1.0 + 0.01 * waves)
    };
    let points = (0..1000).map(|k| {
        let t = f64::from(k) * std::f64::consts::TAU / 1000.0;
        [radius(t) * t.cos(), 0.6 * radius(t) * t.sin()]
    });
    Outline::single(points.collect())
}

fn rectangle(width: f64) -> Outline {
    Outline::single(vec![[0.0, 0.0], [width, 0.0], [width, 1e-4], [0.0, 1e-4]])
}

fn sections() -> Fallible<Vec<(&'static str, Outline)>> {
    Ok(vec![
        ("square", rectangle(1e-4)),
        ("isotropic etch", shipped("drawn/isotropic_etch.toml")?),
        ("KOH groove", shipped("drawn/koh_groove.toml")?),
        ("20 to 1", rectangle(2e-3)),
        ("rough outline", rough()),
    ])
}

fn at(outline: &Outline, cells: f64) -> Fallible<SolvedSection> {
    let options = SolveOptions {
        cells_across: Some(cells),
        memory_limit: 2e10,
        ..SolveOptions::default()
    };
    Ok(solve_outline(outline, &options)?)
}

fn median(mut values: Vec<f64>) -> f64 {
    values.sort_by(f64::total_cmp);
    values.get(values.len() / 2).copied().unwrap_or(f64::NAN)
}

/// Bytes a second that one thread copies, read and written both counted.
fn copied_per_second(len: usize) -> f64 {
    let source = vec![1.0_f64; len];
    let mut target = vec![0.0_f64; len];
    let rounds = 200_000_000 / len;
    let seconds = median(
        (0..RUNS)
            .map(|_| {
                let start = Instant::now();
                for _ in 0..rounds {
                    target.copy_from_slice(std::hint::black_box(&source));
                    std::hint::black_box(&mut target);
                }
                start.elapsed().as_secs_f64()
            })
            .collect(),
    );
    16.0 * (rounds * len) as f64 / seconds
}

/// Time per fluid node by stage, ns, and memory.
fn stages(sections: &[(&str, Outline)], quick: bool) -> Fallible<()> {
    println!("\n## Time per fluid node by stage, ns; one thread\n");
    println!(
        "| section | cells across | fluid nodes | grids | solve | integrals | proof | wall and answers | all | peak bytes per node | allocations |"
    );
    println!("|---|---|---|---|---|---|---|---|---|---|---|");
    for (name, outline) in sections {
        for cells in [64.0, 256.0, 1024.0, 4096.0] {
            let nodes = outline.area() * (cells / shortest(outline)?).powi(2);
            if nodes > if quick { 2e6 } else { 2e7 } {
                continue;
            }
            stage_row(name, outline, cells)?;
        }
    }
    Ok(())
}

/// Diameter of the largest circle in the section, m.
fn shortest(outline: &Outline) -> Fallible<f64> {
    Ok(at(outline, 16.0)?.flow.grid.inscribed_diameter)
}

fn stage_row(name: &str, outline: &Outline, cells: f64) -> Fallible<()> {
    let mut solved = None;
    let memory = allocation_counter::measure(|| solved = Some(at(outline, cells)));
    let first = solved.ok_or("not run")??;
    let nodes = first.flow.grid.fluid_nodes;
    let runs = if nodes > LARGE { 1 } else { RUNS };
    let mut costs = Vec::new();
    for _ in 0..runs {
        costs.push(at(outline, cells)?.cost().clone());
    }
    let of = |names: &[&str]| {
        let each = costs.iter().map(|cost| {
            let stages = cost.stages.iter().filter(|s| names.contains(&s.name));
            stages.map(|s| s.seconds).sum::<f64>()
        });
        1e9 * median(each.collect()) / nodes as f64
    };
    let all = 1e9
        * median(
            costs
                .iter()
                .map(etchwise::flow::SolveCost::seconds)
                .collect(),
        );
    println!(
        "| {name} | {cells} | {nodes} | {:.1} | {:.1} | {:.1} | {:.1} | {:.1} | {:.1} | {:.0} | {} |",
        of(&["crossings", "grids and transfers"]),
        of(&["solve"]),
        of(&["integrals"]),
        of(&["proof"]),
        of(&["wall shear", "answers"]),
        all / nodes as f64,
        memory.bytes_max as f64 / nodes as f64,
        memory.count_total,
    );
    Ok(())
}

/// Time until `K` is within a tolerance: proven, and by the estimate.
fn to_accuracy(sections: &[(&str, Outline)]) -> Fallible<()> {
    println!("\n## Time to an accuracy of K, ms; one thread, everything counted\n");
    println!("| section | asked | cells across | time | reached |");
    println!("|---|---|---|---|---|");
    for (name, outline) in sections {
        let goals = [1e-3, 1e-4, 1e-5].map(Goal::Proven);
        let estimates = [1e-3, 1e-4, 1e-5, 1e-6].map(Goal::Estimated);
        for goal in goals.into_iter().chain(estimates) {
            let options = SolveOptions {
                goal,
                memory_limit: 5e8,
                ..SolveOptions::default()
            };
            let mut seconds = Vec::new();
            let mut last = None;
            for _ in 0..RUNS {
                let start = Instant::now();
                last = Some(solve_outline(outline, &options)?);
                seconds.push(start.elapsed().as_secs_f64());
            }
            let Some(solved) = last else { continue };
            let (kind, asked) = match goal {
                Goal::Proven(asked) => ("proven", asked),
                Goal::Estimated(asked) => ("estimated", asked),
            };
            println!(
                "| {name} | {asked:.0e} {kind} | {:.0} | {:.2} | {:.1e} |",
                solved.flow.grid.cells_across,
                1e3 * median(seconds),
                goal.reached(&solved.flow).unwrap_or(f64::NAN),
            );
        }
    }
    Ok(())
}

/// Time until `K` alone is within a tolerance by its estimate, on a grid that is known, and how far off it then is.
fn alone(sections: &[(&str, Outline)]) -> Fallible<()> {
    println!("\n## K alone, as for neighbours; one thread\n");
    println!(
        "| section | asked | cells across | to find the grid, ms | K, ms | allocations | estimated error | off |"
    );
    println!("|---|---|---|---|---|---|---|---|");
    for (name, outline) in sections {
        let truth = at(outline, REFERENCE_CELLS)?.flow.conductance.value;
        for asked in [1e-3, 1e-4, 1e-5, 1e-6] {
            let start = Instant::now();
            let nearby = NearbySections::new(outline, asked)?;
            let search = start.elapsed().as_secs_f64();
            if nearby.cells_across() > 0.5 * REFERENCE_CELLS {
                continue;
            }
            let mut seconds = Vec::new();
            let mut last = None;
            for _ in 0..RUNS {
                let start = Instant::now();
                last = Some(nearby.conductance(outline)?);
                seconds.push(start.elapsed().as_secs_f64());
            }
            let Some(k) = last else { continue };
            let memory = allocation_counter::measure(|| {
                std::hint::black_box(nearby.conductance(outline).ok());
            });
            println!(
                "| {name} | {asked:.0e} | {:.0} | {:.2} | {:.2} | {} | {:.1e} | {:.1e} |",
                nearby.cells_across(),
                1e3 * search,
                1e3 * median(seconds),
                memory.count_total,
                k.relative(),
                (k.value / truth - 1.0).abs(),
            );
        }
    }
    Ok(())
}

/// One thread against two.
fn threads(outline: &Outline) -> Fallible<()> {
    println!("\n## Two threads against one, 4 million fluid nodes\n");
    let mut seconds = [0.0; 2];
    for (count, slot) in [1, 2].into_iter().zip(&mut seconds) {
        let pool = rayon::ThreadPoolBuilder::new().num_threads(count).build()?;
        let mut runs = Vec::new();
        for _ in 0..RUNS {
            runs.push(pool.install(|| at(outline, 2000.0).map(|s| s.cost().clone()).ok()));
        }
        let solve = |cost: &etchwise::flow::SolveCost| {
            let stage = cost.stages.iter().find(|s| s.name == "solve");
            stage.map_or(f64::NAN, |s| s.seconds)
        };
        *slot = median(runs.iter().flatten().map(solve).collect());
        let all = median(
            runs.iter()
                .flatten()
                .map(etchwise::flow::SolveCost::seconds)
                .collect(),
        );
        println!("{count} threads: solve {:.3} s, all {all:.3} s", *slot);
    }
    println!("solve: {:.2} times as fast", seconds[0] / seconds[1]);
    Ok(())
}

/// Many neighbours of a KOH groove, estimated to 1e-4, on all threads.
fn many() -> Fallible<()> {
    const COUNT: u32 = 2000;
    let groove = |depth: f64, shift: f64| {
        Outline::single(vec![
            [30e-6, -depth],
            [70e-6 + shift, -depth],
            [100e-6, 0.0],
            [shift, 0.0],
        ])
    };
    let nearby = NearbySections::new(&groove(40e-6, 0.0), 1e-4)?;
    let lot: Vec<Outline> = (0..COUNT)
        .map(|k| {
            let t = f64::from(k);
            groove(40e-6 * (1.0 + 0.02 * t.sin()), 1e-6 * (1.7 * t).cos())
        })
        .collect();
    let mut seconds = Vec::new();
    for _ in 0..RUNS {
        let start = Instant::now();
        std::hint::black_box(nearby.conductances(&lot));
        seconds.push(start.elapsed().as_secs_f64());
    }
    println!(
        "\n## {COUNT} neighbours of a KOH groove to 1e-4 (estimate), {} threads\n\n{:.2} s, {:.2} ms a section",
        rayon::current_num_threads(),
        median(seconds.clone()),
        1e3 * median(seconds) / f64::from(COUNT),
    );
    Ok(())
}

fn main() -> Fallible<()> {
    let quick = std::env::args().any(|argument| argument == "quick");
    let sections = sections()?;
    for (what, len) in [("from memory", 16_000_000), ("in the nearest cache", 1000)] {
        println!("copy {what}: {:.1} GB/s", 1e-9 * copied_per_second(len));
    }
    let one = rayon::ThreadPoolBuilder::new().num_threads(1).build()?;
    one.install(|| stages(&sections, quick).map_err(|e| e.to_string()))?;
    one.install(|| to_accuracy(&sections).map_err(|e| e.to_string()))?;
    one.install(|| alone(&sections).map_err(|e| e.to_string()))?;
    threads(&rectangle(1e-4))?;
    many()
}
