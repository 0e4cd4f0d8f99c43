//! Any bytes as a section file, an outline, a drawing, or whatever the content says.

#![no_main]

use etchwise::intake::{ReadOptions, SectionKind, section_from_bytes};

libfuzzer_sys::fuzz_target!(|bytes: &[u8]| {
    for kind in [
        None,
        Some(SectionKind::SectionFile),
        Some(SectionKind::OutlineText),
        Some(SectionKind::OutlineSvg),
    ] {
        let mut options = ReadOptions {
            as_kind: kind,
            unit: Some("um".to_owned()),
            allow_any_size: true,
            ..ReadOptions::default()
        };
        options.instrument.table.unit = Some("um".to_owned());
        options.instrument.table.allow_any_size = true;
        options.instrument.micrograph.scale = Some(1e-6);
        options.instrument.micrograph.allow_any_size = true;
        let _ = section_from_bytes(bytes.to_vec(), "fuzz", &options);
    }
});
