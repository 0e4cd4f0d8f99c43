//! Any bytes as a surface file: what is not one is read as a table.

#![no_main]

mod reading;

use etchwise::intake::SectionKind;

libfuzzer_sys::fuzz_target!(|bytes: &[u8]| {
    reading::read_as(bytes, &[Some(SectionKind::HeightMap)]);
});
