//! Any bytes as a section file, an outline, a drawing, or whatever the content says.

#![no_main]

mod reading;

use etchwise::intake::SectionKind;

libfuzzer_sys::fuzz_target!(|bytes: &[u8]| {
    reading::read_as(bytes, &[
        None,
        Some(SectionKind::SectionFile),
        Some(SectionKind::OutlineText),
        Some(SectionKind::OutlineSvg),
    ]);
});
