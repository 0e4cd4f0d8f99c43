//! The wall shear as a table, in JSON and as a picture, read back.

use etchwise::flow::PointKind;
use etchwise::report::{
    PictureFormat, TextOptions, draw_wall, to_json, to_text, wall_csv, wall_picture_bytes,
};

use crate::pictures::boxes;
use crate::report_samples::{annulus, rectangle};
use crate::{close, sample};

#[test]
fn the_table_holds_every_point_of_the_curve() {
    let sample = annulus([1e-3, 0.0], 80e-6, 30e-6, 20);
    let text = wall_csv(&sample.full()).unwrap();
    let mut reader = csv::Reader::from_reader(text.as_bytes());
    let heads: Vec<String> = reader
        .headers()
        .unwrap()
        .iter()
        .map(str::to_owned)
        .collect();
    assert_eq!(
        heads.join(","),
        "loop,wall,arc_length_m,x_m,y_m,nx,ny,shear_per_gradient_m,shear_pa,shear_dyn_per_cm2,kind"
    );
    let rows: Vec<csv::StringRecord> = reader.records().map(Result::unwrap).collect();
    let loops = &sample.flow.wall_shear.curve.loops;
    assert_eq!(
        rows.len(),
        loops.iter().map(|l| l.points.len()).sum::<usize>()
    );
    for (row, point) in rows.iter().zip(loops.iter().flat_map(|l| &l.points)) {
        let number = |k: usize| row[k].parse::<f64>().unwrap();
        close(number(2), point.arc_length, 1e-15);
        close(number(3), point.at[0], 1e-15);
        close(number(7), point.shear_per_gradient, 1e-15);
        close(
            number(8),
            point.shear_per_gradient * sample.point.pressure_gradient,
            1e-15,
        );
        close(number(9), 10.0 * number(8), 1e-15);
        assert!(
            ["lid", "floor", "left", "right"].contains(&&row[1]),
            "{row:?}"
        );
        assert_eq!(&row[10], "regular");
    }
    assert_eq!(&rows[0][0], "1");
    assert_eq!(&rows[rows.len() - 1][0], "2");
    // Without an operating point the fields of the unit stay empty, and without walls their names.
    let bare = wall_csv(&sample.bare()).unwrap();
    let row = bare.lines().nth(1).unwrap();
    assert!(
        row.starts_with("1,,") && row.ends_with(",,,regular"),
        "{row}"
    );
}

#[test]
fn a_corner_has_a_row_for_the_wall_on_either_side() {
    let sample = rectangle([0.0, 0.0], 120e-6, 60e-6, 40);
    let text = wall_csv(&sample.full()).unwrap();
    let corners: Vec<Vec<&str>> = text
        .lines()
        .map(|line| line.split(',').collect::<Vec<_>>())
        .filter(|row| row[10] == "convex_corner")
        .collect();
    let walls: Vec<&str> = corners.iter().map(|row| row[1]).collect();
    assert_eq!(
        walls,
        [
            "floor", "floor", "right", "right", "lid", "lid", "left", "left"
        ]
    );
    assert!(corners.iter().all(|row| row[7] == "0.0"));
}

#[test]
fn json_gives_every_wall_in_every_unit() {
    let sample = rectangle([0.0, 0.0], 120e-6, 60e-6, 40);
    let all: serde_json::Value = serde_json::from_str(&to_json(&sample.full()).unwrap()).unwrap();
    let shear = &all["wall_shear"];
    assert_eq!(shear["walls"].as_array().unwrap().len(), 4);
    let number = |path: &str| shear.pointer(path).unwrap().as_f64().unwrap();
    for (k, wall) in sample.walls.walls.iter().enumerate() {
        assert_eq!(shear["walls"][k]["name"], wall.name.as_str());
        close(
            number(&format!("/walls/{k}/per_gradient/mean/value")),
            wall.mean,
            1e-14,
        );
        let gradient = sample.point.pressure_gradient;
        close(
            number(&format!(
                "/walls/{k}/at_operating_point/percentiles/2/value"
            )),
            wall.percentiles[2] * gradient,
            1e-14,
        );
        close(
            number(&format!("/walls/{k}/per_flow_rate/max/value")),
            wall.max * gradient / sample.point.flow_rate,
            1e-9,
        );
    }
    assert_eq!(shear["whole"]["per_flow_rate"]["mean"]["unit"], "Pa s/m^3");
    let bare: serde_json::Value = serde_json::from_str(&to_json(&sample.bare()).unwrap()).unwrap();
    assert!(bare["wall_shear"]["walls"].is_null());
    assert!(bare["wall_shear"]["absent_because"].is_string());
}

#[test]
fn the_text_names_every_wall_with_its_units() {
    let sample = rectangle([0.0, 0.0], 120e-6, 60e-6, 40);
    let text = to_text(&sample.full(), TextOptions::default());
    for word in [
        "lid ",
        "floor ",
        "left ",
        "right ",
        "whole wall ",
        "dyn/cm\u{b2}",
        "Pa per \u{b5}L/min",
    ] {
        assert!(text.contains(word), "{word}: {text}");
    }
}

#[test]
fn the_picture_is_readable_and_its_labels_do_not_overlap() {
    let samples = [
        sample(),
        annulus([0.0, 0.0], 80e-6, 30e-6, 16),
        rectangle([0.0, 0.0], 1e-3, 10e-6, 8),
    ];
    for sample in &samples {
        for document in [sample.bare(), sample.full()] {
            let drawing = draw_wall(&document, &sample.walls).unwrap();
            let boxes = boxes(&drawing);
            assert!(boxes.len() > 12);
            for (n, (a, text)) in boxes.iter().enumerate() {
                let inside = a[0] >= 0.0 && a[1] >= 0.0 && a[2] <= f64::from(drawing.width);
                assert!(
                    inside && a[3] <= f64::from(drawing.height),
                    "`{text}` leaves the page"
                );
                for (b, other) in &boxes[..n] {
                    let apart = a[2] <= b[0] || b[2] <= a[0] || a[3] <= b[1] || b[3] <= a[1];
                    assert!(apart, "`{text}` overlaps `{other}`");
                }
            }
        }
    }
    let svg =
        wall_picture_bytes(&samples[0].full(), &samples[0].walls, PictureFormat::Svg).unwrap();
    let text = String::from_utf8(svg).unwrap();
    let tree = roxmltree::Document::parse(&text).unwrap();
    let words: Vec<&str> = tree
        .descendants()
        .filter(|n| n.has_tag_name("text"))
        .filter_map(|n| n.text())
        .collect();
    assert!(
        words.contains(&"lid") && words.contains(&"dyn/cm\u{b2}"),
        "{words:?}"
    );
    assert!(
        words.iter().any(|w| w.starts_with("arc length / ")),
        "{words:?}"
    );
    let png =
        wall_picture_bytes(&samples[0].full(), &samples[0].walls, PictureFormat::Png).unwrap();
    let image = image::load_from_memory(&png).unwrap().to_rgb8();
    let blue = image.pixels().filter(|p| p.0 == [0, 90, 156]).count();
    assert!(blue > 1000, "{blue} pixels of the curve");
}

#[test]
fn the_curve_of_a_singular_corner_leaves_the_plot_at_its_top() {
    // Not a solution: a shape whose curve the samples make unbounded at one corner.
    let mut sample = rectangle([0.0, 0.0], 120e-6, 60e-6, 40);
    let along = &mut sample.flow.wall_shear.curve.loops[0];
    for point in &mut along.points {
        if (point.arc_length - 120e-6).abs() < 1e-12 {
            point.kind = PointKind::SingularCorner;
        }
    }
    let drawing = draw_wall(&sample.full(), &sample.walls).unwrap();
    let ends_at_top = drawing.items.iter().any(|item| match item {
        etchwise::report::Item::Lines { lines, colour, .. } if *colour == [0, 90, 156] => {
            lines.len() > 1
        }
        _ => false,
    });
    assert!(ends_at_top, "the curve is not cut");
}
