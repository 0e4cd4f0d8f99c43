//! Any bytes as a picture with a stated scale.

#![no_main]

mod reading;

use etchwise::intake::SectionKind;

libfuzzer_sys::fuzz_target!(|bytes: &[u8]| {
    reading::read_as(bytes, &[Some(SectionKind::Micrograph)]);
});
