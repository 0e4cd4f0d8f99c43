//! Any bytes as a trace, and as a height map in columns, through to sections.

#![no_main]

mod reading;

use etchwise::intake::SectionKind;

libfuzzer_sys::fuzz_target!(|bytes: &[u8]| {
    reading::read_as(bytes, &[Some(SectionKind::Trace), Some(SectionKind::HeightMap)]);
});
