//! The text for people: the golden one, ASCII, verbose, with and without a fluid.

use etchwise::report::{TextOptions, to_text};

use crate::report_samples::warning;
use crate::sample;

#[test]
fn the_text_of_a_full_document_is_the_golden_one() {
    let text = to_text(&sample().full(), TextOptions::default());
    let golden = include_str!("rectangle.txt");
    for (n, (line, expected)) in text.lines().zip(golden.lines()).enumerate() {
        assert_eq!(
            line,
            expected,
            "line {} of tests/exported/rectangle.txt",
            n + 1
        );
    }
    assert_eq!(text.lines().count(), golden.lines().count());
}

#[test]
fn ascii_text_is_ascii_and_says_the_same() {
    let mut sample = sample();
    sample.name = "caf\u{e9}\u{1b}[31m".to_owned();
    let unicode = to_text(&sample.full(), TextOptions::default());
    let ascii = to_text(
        &sample.full(),
        TextOptions {
            ascii: true,
            verbose: false,
        },
    );
    assert!(ascii.is_ascii());
    assert!(
        !unicode.contains('\u{1b}'),
        "names cannot control the terminal"
    );
    assert!(unicode.contains("66.667 \u{b5}m") && ascii.contains("66.667 um"));
    assert_eq!(unicode.lines().count(), ascii.lines().count());
}

#[test]
fn text_without_a_fluid_has_shear_per_gradient_and_no_caution() {
    let mut sample = sample();
    let text = to_text(&sample.bare(), TextOptions::default());
    assert!(text.contains("Wall shear at a pressure gradient of 1 kPa/m"));
    assert!(!text.contains("Operating point") && !text.contains("caution"));
    assert!(!text.contains("0.042 s"), "time is for verbose text only");
    let verbose = to_text(
        &sample.bare(),
        TextOptions {
            ascii: false,
            verbose: true,
        },
    );
    assert!(
        verbose.contains("0.042 s")
            && verbose.contains("from best K")
            && verbose.contains("rellich")
    );
    sample.flow.identities[1].holds = false;
    sample.flow.warnings.push(warning());
    sample.flow.wall_shear.singular_corners.push([0.0, 0.0]);
    let text = to_text(&sample.bare(), TextOptions::default());
    assert!(
        text.contains("FAILS")
            && text.contains("! shear_singular")
            && text.contains("no bound at 1 re-entrant")
    );
}
