//! Check pictures: decoded pixels, parsed SVG, labels that fit, honest thinning, hostile input.

use etchwise::report::{
    Band, BandKind, CheckPicture, Curve, CurveKind, CurvePanel, Cut, Dimension, Drawing,
    ImagePanel, Item, MapPanel, Mark, MarkKind, Panel, PictureError, PictureFormat, Region,
    RegionKind, check_picture_bytes, draw_check, to_svg,
};

use crate::check_samples::{
    image_panel, levelled_panel, map_panel, noise, section_panel, trace_panel, whole,
};
use crate::pictures::boxes;

fn page(panel: Panel) -> CheckPicture {
    CheckPicture {
        title: "invented".to_owned(),
        panels: vec![panel],
        ..CheckPicture::default()
    }
}

fn curves(points: Vec<[f64; 2]>) -> Panel {
    Panel::Curves(CurvePanel {
        x_label: "position".to_owned(),
        z_label: "height".to_owned(),
        curves: vec![Curve {
            points,
            kind: CurveKind::Measured,
            label: "trace".to_owned(),
        }],
        ..CurvePanel::default()
    })
}

fn texts(drawing: &Drawing) -> Vec<&str> {
    boxes(drawing).into_iter().map(|(_, text)| text).collect()
}

/// Every coordinate is finite and within or near the page, and texts neither leave it nor overlap.
fn check_sound(drawing: &Drawing) {
    let boxes = boxes(drawing);
    for (n, (a, text)) in boxes.iter().enumerate() {
        let inside = a[0] >= 0.0 && a[1] >= 0.0 && a[2] <= f64::from(drawing.width);
        assert!(
            inside && a[3] <= f64::from(drawing.height),
            "`{text}` leaves the page"
        );
        for (b, other) in &boxes[..n] {
            let apart = a[2] <= b[0] || b[2] <= a[0] || a[3] <= b[1] || b[3] <= a[1];
            assert!(apart, "`{text}` overlaps `{other}`: {a:?} {b:?}");
        }
    }
    for item in &drawing.items {
        let lines = match item {
            Item::Lines { lines, .. } => lines,
            Item::Area { loops, .. } => loops,
            _ => continue,
        };
        for p in lines.iter().flatten() {
            let inside = p[0] > -60.0 && p[0] < f64::from(drawing.width) + 60.0 && p[1] > -60.0;
            assert!(inside && p[1] < f64::from(drawing.height) + 60.0, "{p:?}");
        }
    }
}

#[test]
fn the_whole_page_has_every_panel_number_and_note_and_no_text_over_another() {
    let drawing = draw_check(&whole()).unwrap();
    check_sound(&drawing);
    let texts = texts(&drawing);
    for wanted in [
        "A: Height map with the lines of its traces",
        "heights are stretched 20 times, x:z = 1:20",
        "equal scale, x:z = 1:1",
        "position / mm",
        "height / \u{b5}m",
        "depth 23.04 \u{b5}m",
        "top width 300.2 \u{b5}m",
        "spikes (3)",
        "lands (3)",
        "bridged (4)",
        "trace 1",
        "direction of the grooves, 84.00\u{b0} from x",
        "4.",
        "Warnings",
        "50 \u{b5}m",
    ] {
        assert!(texts.contains(&wanted), "{wanted}: {texts:?}");
    }
    let note = |start: &str| texts.iter().any(|t| t.starts_with(start));
    let missing = map_panel().heights.iter().filter(|h| h.is_nan()).count();
    assert!(note(&format!("no height: {missing} points, 0.6")));
    assert!(note("Heights reach from -13.6"));
    assert!(drawing.description.contains("A parabola through zones"));
}

#[test]
fn the_svg_is_accessible_and_hostile_words_stay_words() {
    let hostile = "</text><script>\"&'\u{1b}[2J\u{202e}\n";
    let mut picture = whole();
    picture.title = hostile.to_owned();
    picture.notes.push(hostile.to_owned());
    picture.warnings.push(hostile.repeat(3));
    if let Some(Panel::Curves(panel)) = picture.panels.get_mut(2) {
        panel.title = hostile.to_owned();
        panel.x_label = hostile.to_owned();
        panel.curves[0].label = hostile.to_owned();
        panel.bands[0].label = hostile.to_owned();
        panel.marks[0].label = hostile.to_owned();
        panel.dimensions[0].text = hostile.to_owned();
    }
    let svg =
        String::from_utf8(check_picture_bytes(&picture, PictureFormat::Svg).unwrap()).unwrap();
    let tree = roxmltree::Document::parse(&svg).unwrap();
    let root = tree.root_element();
    assert_eq!(root.attribute("role"), Some("img"));
    assert_eq!(root.attribute("aria-labelledby"), Some("title desc"));
    assert!(!tree.descendants().any(|n| n.has_tag_name("script")));
    let first = |tag: &str| tree.descendants().find(|n| n.has_tag_name(tag)).unwrap();
    assert!(first("title").text().unwrap().contains("<script>"));
    assert!(first("desc").text().unwrap().contains("x:z = 1:20"));
    for node in tree.descendants() {
        for name in ["x", "y", "width", "height", "stroke-width", "font-size"] {
            if let Some(value) = node.attribute(name) {
                let number: f64 = value.parse().unwrap_or(f64::NAN);
                assert!(number.is_finite(), "{name}={value:?}");
            }
        }
    }
}

/// Highest point of a line of the measured curve, px.
fn highest(drawing: &Drawing) -> f64 {
    drawing
        .items
        .iter()
        .filter_map(|item| match item {
            Item::Lines {
                lines,
                colour: [112, 112, 112],
                ..
            } => Some(lines),
            _ => None,
        })
        .flatten()
        .flatten()
        .map(|p| p[1])
        .fold(f64::INFINITY, f64::min)
}

#[test]
fn a_million_noisy_samples_fit_in_little_and_a_single_spike_keeps_its_height() {
    let few = draw_check(&page(Panel::Curves(trace_panel(6_001)))).unwrap();
    let many = draw_check(&page(Panel::Curves(trace_panel(1_000_001)))).unwrap();
    let bytes = to_svg(&many).unwrap().len();
    assert!(bytes < 300_000, "{bytes}");
    let spiked = |height: f64| {
        let mut points: Vec<[f64; 2]> = (0..1_000_000)
            .map(|i| [f64::from(i) * 1e-9, 1e-8 * noise(i as usize)])
            .collect();
        points[700_123][1] = height;
        // The range of the axis must not depend on the spike.
        points.extend([[1e-3, f64::NAN], [1e-3, 2e-6], [1e-3, f64::NAN]]);
        points[0][1] = -1e-6;
        let drawing = draw_check(&page(curves(points))).unwrap();
        let svg = to_svg(&drawing).unwrap();
        assert!(svg.len() < 200_000, "{}", svg.len());
        let lines: Vec<[f64; 2]> = drawing
            .items
            .iter()
            .filter_map(|item| match item {
                Item::Lines {
                    lines,
                    colour: [112, 112, 112],
                    ..
                } => Some(lines.iter().flatten().copied()),
                _ => None,
            })
            .flatten()
            .filter(|p| p[0] < 1_000.0)
            .collect();
        lines.iter().map(|p| p[1]).fold(f64::INFINITY, f64::min)
    };
    let (half, full) = (spiked(0.9e-6), spiked(1.8e-6));
    let flat = spiked(0.0);
    assert!(
        ((flat - full) / (flat - half) - 2.0).abs() < 0.05,
        "{flat} {half} {full}"
    );
    assert!((highest(&few) - highest(&many)).abs() < 2.0);
}

#[test]
fn nothing_to_draw_is_an_error_and_one_empty_panel_says_so_in_its_place() {
    let nothing = [
        CheckPicture::default(),
        page(Panel::Curves(CurvePanel::default())),
        page(curves(vec![[0.0, f64::NAN], [f64::INFINITY, 1.0]])),
        page(Panel::Map(MapPanel::default())),
        page(Panel::Map(MapPanel {
            size: [2, 2],
            spacing: [1e-6; 2],
            heights: vec![f32::NAN; 4],
            ..MapPanel::default()
        })),
        page(Panel::Map(MapPanel {
            size: [2, 2],
            spacing: [0.0, f64::NAN],
            heights: vec![1.0; 4],
            ..MapPanel::default()
        })),
        page(Panel::Map(MapPanel {
            size: [usize::MAX, 2],
            spacing: [1e-6; 2],
            heights: vec![1.0; 4],
            ..MapPanel::default()
        })),
        page(Panel::Image(ImagePanel::default())),
        page(Panel::Image(ImagePanel {
            size: [2, 2],
            grey: vec![1; 3],
            pixel_size: [1e-6; 2],
            ..ImagePanel::default()
        })),
        page(Panel::Image(ImagePanel {
            size: [2, 2],
            grey: vec![1; 4],
            pixel_size: [0.0; 2],
            ..ImagePanel::default()
        })),
    ];
    for picture in nothing {
        let error = draw_check(&picture).unwrap_err();
        assert!(matches!(error, PictureError::EmptyCheck { .. }));
        assert!(
            error
                .to_string()
                .starts_with("the check picture has nothing to draw: ")
        );
    }
    let mut mixed = page(curves(vec![[0.0, f64::NAN]]));
    mixed.panels.push(curves(vec![[0.0, 0.0], [1e-3, 1e-6]]));
    let drawing = draw_check(&mixed).unwrap();
    let wanted = "Nothing to draw: no place in it has finite coordinates.";
    assert!(texts(&drawing).contains(&wanted));
}

#[test]
fn extents_from_a_nanometre_to_a_metre_and_single_places_can_be_drawn() {
    for across in [0.0, 1e-9, 1e-3, 1.0, 1e8] {
        for up in [0.0, 1e-12, 1e-9, 1e-6, 1.0, 1e8] {
            for start in [0.0, 1.0, -2e-3] {
                for is_equal in [false, true] {
                    let points = vec![[start, start], [start + across, start + up]];
                    let Panel::Curves(mut panel) = curves(points) else {
                        continue;
                    };
                    panel.equal_scale = is_equal;
                    let drawing = draw_check(&page(Panel::Curves(panel))).unwrap();
                    check_sound(&drawing);
                    assert!(drawing.height < 900, "{across} {up}: {}", drawing.height);
                }
            }
        }
    }
    let one = page(curves(vec![[1e-3, 2e-6]]));
    let png = check_picture_bytes(&one, PictureFormat::Png).unwrap();
    let picture = image::load_from_memory(&png).unwrap().to_rgb8();
    let grey = |p: &image::Rgb<u8>| p.0.iter().all(|v| (90..150).contains(v));
    assert!(picture.pixels().any(grey), "the one sample is a dot");
}

#[test]
fn hostile_numbers_neither_stop_the_program_nor_fill_the_page() {
    let wild = [f64::NAN, f64::INFINITY, -1e300, 1e300, 5e-324, 0.0, 1e-6];
    let places: Vec<[f64; 2]> = wild
        .iter()
        .flat_map(|&a| wild.iter().map(move |&b| [a, b]))
        .collect();
    let Panel::Curves(mut panel) = curves(places.clone()) else {
        unreachable!()
    };
    for (n, &p) in places.iter().enumerate() {
        let label = "word ".repeat(n % 9);
        let kind = [BandKind::Groove, BandKind::Bridged, BandKind::Land][n % 3];
        panel.bands.push(Band {
            from: p[0],
            to: p[1],
            kind,
            label: label.clone(),
        });
        panel.marks.push(Mark {
            at: p,
            kind: MarkKind::Spike,
            label: label.clone(),
        });
        panel.dimensions.push(Dimension {
            from: p,
            to: places[(n * 7) % places.len()],
            text: label.clone(),
        });
        panel.regions.push(Region {
            loops: vec![places.clone(), vec![p], Vec::new()],
            kind: [RegionKind::Lid, RegionKind::Section][n % 2],
            label,
        });
    }
    let image = ImagePanel {
        outlines: panel.regions.clone(),
        crop: Some([[f64::NAN, 1.0], [1e300, 2.0]]),
        seeds: places.clone(),
        dimensions: panel.dimensions.clone(),
        ..image_panel()
    };
    let map = MapPanel {
        cuts: places
            .iter()
            .map(|&p| Cut {
                from: p,
                to: [p[1], p[0]],
                width: p[0],
                label: "cut".to_owned(),
            })
            .collect(),
        groove_direction: Some(f64::INFINITY),
        ..map_panel()
    };
    let mut picture = page(Panel::Curves(panel));
    picture
        .panels
        .extend([Panel::Image(image), Panel::Map(map)]);
    picture.notes = vec!["long".repeat(100_000), String::new()];
    let drawing = draw_check(&picture).unwrap();
    check_sound(&drawing);
    assert!(to_svg(&drawing).unwrap().len() < 4_000_000);
    assert!(check_picture_bytes(&picture, PictureFormat::Png).is_ok());
}

#[test]
fn very_many_panels_notes_bands_and_marks_stay_within_bounds_and_are_counted() {
    let Panel::Curves(mut panel) = curves((0..10).map(|i| [f64::from(i), 1.0]).collect()) else {
        unreachable!()
    };
    for i in 0..100_000 {
        let at = f64::from(i) * 9e-5;
        panel.marks.push(Mark {
            at: [at, noise(i as usize)],
            kind: MarkKind::Spike,
            label: "1.0 \u{b5}m".to_owned(),
        });
        panel.bands.push(Band {
            from: at,
            to: at + 1e-5,
            kind: BandKind::Bridged,
            label: String::new(),
        });
        panel.dimensions.push(Dimension {
            from: [at, 0.0],
            to: [at, 1.0],
            text: "depth".to_owned(),
        });
    }
    let mut picture = page(Panel::Curves(panel));
    picture
        .panels
        .extend(vec![curves(vec![[0.0, 0.0], [1.0, 1.0]]); 60]);
    picture.notes = vec!["word ".repeat(2_000); 500];
    let drawing = draw_check(&picture).unwrap();
    check_sound(&drawing);
    let texts = texts(&drawing);
    for wanted in [
        "21 more panels are not shown.",
        "... and 380 more, not shown.",
        "spikes (100000)",
        "bridged (100000)",
    ] {
        assert!(texts.contains(&wanted), "{wanted}");
    }
    assert!(drawing.height < 60_000, "{}", drawing.height);
    assert!(to_svg(&drawing).unwrap().len() < 6_000_000);
}

#[test]
fn each_panel_alone_is_sound_and_its_svg_below_a_megabyte() {
    for panel in [
        Panel::Curves(trace_panel(20_000)),
        Panel::Curves(levelled_panel(20_000)),
        Panel::Curves(section_panel(false)),
        Panel::Curves(section_panel(true)),
        Panel::Map(map_panel()),
        Panel::Image(image_panel()),
    ] {
        let drawing = draw_check(&page(panel)).unwrap();
        check_sound(&drawing);
        let bytes = to_svg(&drawing).unwrap().len();
        assert!(bytes < 1_000_000, "{bytes}");
    }
}

#[test]
fn the_png_shows_map_colours_hatching_and_the_grey_picture_where_they_belong() {
    let bright = [253, 231, 37];
    let dark = [68, 1, 84];
    let mut heights = vec![0.0_f32; 100];
    for (index, height) in heights.iter_mut().enumerate() {
        // Rows run upwards: the upper five are high.
        *height = if index >= 50 { 1e-6 } else { 0.0 };
    }
    heights[5] = f32::NAN;
    let map = MapPanel {
        size: [10, 10],
        spacing: [1e-6; 2],
        heights,
        ..MapPanel::default()
    };
    let png = check_picture_bytes(&page(Panel::Map(map)), PictureFormat::Png).unwrap();
    let picture = image::load_from_memory(&png).unwrap().to_rgb8();
    // The map is 440 px square; its left border is at 40 + 72 px.
    let rows_of = |x: u32, colour: [u8; 3]| -> Vec<u32> {
        (0..picture.height())
            .filter(|&y| picture.get_pixel(x, y).0 == colour)
            .collect()
    };
    let (high, low) = (rows_of(130, bright), rows_of(130, dark));
    assert!((200..=220).contains(&high.len()) && (200..=220).contains(&low.len()));
    assert!(high.last() < low.first(), "high is above low");
    let hatched = rows_of(112 + 44 * 5 + 22, [226, 226, 226]).len();
    assert!((20..=40).contains(&hatched), "{hatched}");

    let image = ImagePanel {
        size: [2, 1],
        grey: vec![30, 220],
        pixel_size: [1e-6; 2],
        ..ImagePanel::default()
    };
    let png = check_picture_bytes(&page(Panel::Image(image)), PictureFormat::Png).unwrap();
    let picture = image::load_from_memory(&png).unwrap().to_rgb8();
    let count = |grey: u8| picture.pixels().filter(|p| p.0 == [grey; 3]).count();
    // Borders of letters may have these greys too.
    let half = 400 * 400..400 * 400 + 200;
    assert!(half.contains(&count(30)) && half.contains(&count(220)));
}
