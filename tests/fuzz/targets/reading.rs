//! What every target does: bytes read as kinds of file, with a unit and a scale stated.

use etchwise::intake::{ReadOptions, SectionKind, section_from_bytes};

/// Reads bytes as each of the kinds; `None` finds the kind from the content.
pub fn read_as(bytes: &[u8], kinds: &[Option<SectionKind>]) {
    for &as_kind in kinds {
        let mut options = ReadOptions {
            as_kind,
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
}
