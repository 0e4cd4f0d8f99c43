//! Binary SDF: a header of fixed fields, numbers with the lowest byte first, and a trailer.

use super::file_defects::FileDefects;
use super::map_problem::MapProblem;
use super::sdf::{SdfHeader, SdfRecords, SdfVersion, number_type};
use super::x3p_description::shortened;

/// Longest trailer that is kept, bytes.
const LONGEST_TRAILER: usize = 1 << 20;
/// Bytes of the manufacturer's name, of a date, and of the first word of the file.
const NAME_BYTES: usize = 10;
const DATE_BYTES: usize = 12;
const MAGIC_BYTES: usize = 8;

/// Reads what follows the first word.
pub(super) fn read_binary(
    bytes: &[u8],
    version: SdfVersion,
    defects: &mut FileDefects,
) -> Result<SdfRecords, MapProblem> {
    let count_bytes = if version == SdfVersion::Iso2 { 4 } else { 2 };
    let header_bytes = NAME_BYTES + 2 * DATE_BYTES + 2 * count_bytes + 4 * 8 + 3;
    let mut rest = Fields(bytes.get(..header_bytes).ok_or(MapProblem::Truncated {
        found: bytes.len() + MAGIC_BYTES,
        expected: header_bytes + MAGIC_BYTES,
        what: "bytes of the header",
    })?);
    let metadata = [
        ("ManufacID", NAME_BYTES),
        ("CreateDate", DATE_BYTES),
        ("ModDate", DATE_BYTES),
    ]
    .map(|(key, length)| (key.to_owned(), rest.text(length)));
    let along_x = rest.count(count_bytes);
    let along_y = rest.count(count_bytes);
    let [x_scale, y_scale, z_scale, z_resolution] = [(); 4].map(|()| rest.float());
    let [compression, data_type, check_type] = [(); 3].map(|()| rest.byte());
    let mut metadata = metadata.to_vec();
    metadata.push(("Zresolution".to_owned(), z_resolution.to_string()));
    check_codes(&compression.to_string(), &check_type.to_string())?;
    let code = data_type.to_string();
    let number = number_type(&code, version).ok_or_else(|| MapProblem::HeaderValue {
        key: "DataType".to_owned(),
        text: code,
        needed: "a code from 0 to 7",
    })?;
    let header = SdfHeader {
        version,
        along_x,
        along_y,
        scales: [x_scale, y_scale, z_scale],
        number,
        metadata,
    };
    let points = header.points()?;
    let data = bytes.get(header_bytes..).unwrap_or_default();
    let needed = points * number.bytes();
    let Some((data, after)) = data.split_at_checked(needed) else {
        return Err(MapProblem::Truncated {
            found: data.len() / number.bytes(),
            expected: points,
            what: "heights",
        });
    };
    let numbers = data
        .chunks_exact(number.bytes())
        .map(|bytes| number.decode(bytes))
        .collect();
    Ok(SdfRecords {
        header,
        numbers,
        trailer: trailer(after, defects),
        is_text: false,
    })
}

/// Refuses packed data and check sums of data.
pub(super) fn check_codes(compression: &str, check_type: &str) -> Result<(), MapProblem> {
    if compression != "0" {
        return Err(MapProblem::Unsupported {
            what: format!("packed heights (Compression {})", shortened(compression)),
        });
    }
    if check_type != "0" {
        return Err(MapProblem::Unsupported {
            what: format!(
                "check sums among its heights (CheckType {})",
                shortened(check_type)
            ),
        });
    }
    Ok(())
}

/// The text behind the heights; anything else is named.
fn trailer(after: &[u8], defects: &mut FileDefects) -> String {
    // Some writers fill the end with zeros.
    let text_end = after.iter().rposition(|&b| b != 0).map_or(0, |at| at + 1);
    if text_end < after.len() && text_end == 0 {
        defects.note(format!("{} zero bytes follow the heights", after.len()));
        return String::new();
    }
    let kept = after
        .get(..text_end.min(LONGEST_TRAILER))
        .unwrap_or_default();
    let plain = |b: &u8| b.is_ascii_graphic() || b.is_ascii_whitespace();
    if text_end > LONGEST_TRAILER || !kept.iter().all(plain) {
        defects.note(format!(
            "{} bytes follow the heights that are not a trailer of plain text; passed over",
            after.len()
        ));
        return String::new();
    }
    let text = String::from_utf8_lossy(kept);
    text.trim().trim_matches('*').to_owned()
}

/// Fixed fields, read one after the other from bytes that are long enough.
struct Fields<'a>(&'a [u8]);

impl Fields<'_> {
    fn take<const N: usize>(&mut self) -> [u8; N] {
        let Some((head, tail)) = self.0.split_first_chunk() else {
            return [0; N];
        };
        self.0 = tail;
        *head
    }

    /// A text that ends at its length, or at a zero byte.
    fn text(&mut self, length: usize) -> String {
        let (field, tail) = self.0.split_at_checked(length).unwrap_or_default();
        self.0 = tail;
        let end = field.iter().position(|&b| b == 0).unwrap_or(field.len());
        let text = String::from_utf8_lossy(field.get(..end).unwrap_or_default());
        shortened(text.trim())
    }

    fn count(&mut self, bytes: usize) -> u64 {
        if bytes == 2 {
            u64::from(u16::from_le_bytes(self.take()))
        } else {
            u64::from(u32::from_le_bytes(self.take()))
        }
    }

    fn float(&mut self) -> f64 {
        f64::from_le_bytes(self.take())
    }

    fn byte(&mut self) -> u8 {
        let [byte] = self.take();
        byte
    }
}
