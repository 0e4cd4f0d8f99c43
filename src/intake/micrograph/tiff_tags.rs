//! The directories of a TIFF file: tags with their values as bytes, by number.
//!
//! The decoder of pixels reads texts as UTF-8 only and stops at a wrong one; here texts stay as they are. Every
//! offset and count is checked against the file, and chains of pages that turn back on themselves end.

/// Most pages that are looked at.
const MOST_PAGES: usize = 4096;
/// Most tags of one page.
const MOST_TAGS: u64 = 4096;

/// A tag with its values.
#[derive(Debug, Clone, Copy, PartialEq)]
pub(super) struct Tag<'a> {
    number: u16,
    kind: u16,
    value: &'a [u8],
    /// Where the value lies in the file.
    offset: usize,
}

/// One page.
#[derive(Debug, Clone, PartialEq)]
pub(super) struct Directory<'a> {
    tags: Vec<Tag<'a>>,
    order: Order,
    /// Where it lies in the file.
    pub(super) offset: u64,
}

/// All pages.
#[derive(Debug, Clone, PartialEq)]
pub(super) struct Directories<'a> {
    pub(super) pages: Vec<Directory<'a>>,
    /// Whether the chain of pages is broken or turns back on itself.
    pub(super) is_broken: bool,
}

/// Byte order, and whether offsets have 8 bytes.
#[derive(Debug, Clone, Copy, PartialEq)]
struct Order {
    is_little: bool,
    is_big_tiff: bool,
}

impl Order {
    fn unsigned(self, bytes: &[u8]) -> u64 {
        let add = |sum: u64, byte: &u8| (sum << 8) | u64::from(*byte);
        if self.is_little {
            bytes.iter().rev().fold(0, add)
        } else {
            bytes.iter().fold(0, add)
        }
    }
}

/// Bytes of one value of a kind; zero for an unknown kind.
fn bytes_of(kind: u16) -> u64 {
    match kind {
        1 | 2 | 6 | 7 => 1,
        3 | 8 => 2,
        4 | 9 | 11 | 13 => 4,
        5 | 10 | 12 | 16 | 17 | 18 => 8,
        _ => 0,
    }
}

/// A stretch of the file.
fn slice(bytes: &[u8], offset: u64, length: u64) -> Option<&[u8]> {
    let from = usize::try_from(offset).ok()?;
    let to = usize::try_from(offset.checked_add(length)?).ok()?;
    bytes.get(from..to)
}

/// Reads the directories; `None` if the file is no TIFF.
pub(super) fn directories(bytes: &[u8]) -> Option<Directories<'_>> {
    let is_little = match bytes.get(..2)? {
        b"II" => true,
        b"MM" => false,
        _ => return None,
    };
    let mut order = Order {
        is_little,
        is_big_tiff: false,
    };
    let mut next = match order.unsigned(bytes.get(2..4)?) {
        42 => order.unsigned(bytes.get(4..8)?),
        43 => {
            order.is_big_tiff = true;
            order.unsigned(bytes.get(8..16)?)
        }
        _ => return None,
    };
    let mut pages = Vec::new();
    let mut seen = Vec::new();
    let mut is_broken = false;
    while next != 0 {
        if pages.len() >= MOST_PAGES || seen.contains(&next) {
            is_broken = true;
            break;
        }
        seen.push(next);
        let Some((page, after)) = directory(bytes, next, order) else {
            is_broken = true;
            break;
        };
        pages.push(page);
        next = after;
    }
    Some(Directories { pages, is_broken })
}

/// One directory and the offset of the next.
fn directory(bytes: &[u8], offset: u64, order: Order) -> Option<(Directory<'_>, u64)> {
    let (count_bytes, entry_bytes, word) = if order.is_big_tiff {
        (8, 20, 8)
    } else {
        (2, 12, 4)
    };
    let count = order.unsigned(slice(bytes, offset, count_bytes)?);
    if count > MOST_TAGS {
        return None;
    }
    let first = offset.checked_add(count_bytes)?;
    let entries = slice(bytes, first, count * entry_bytes)?;
    let mut tags = Vec::new();
    for (index, entry) in entries.chunks_exact(entry_bytes as usize).enumerate() {
        let field = |from: usize, length: usize| entry.get(from..from + length);
        let number = order.unsigned(field(0, 2)?) as u16;
        let kind = order.unsigned(field(2, 2)?) as u16;
        let values = order.unsigned(field(4, word)?);
        let Some(length) = values.checked_mul(bytes_of(kind)).filter(|l| *l > 0) else {
            continue;
        };
        let place = if length <= word as u64 {
            first + index as u64 * entry_bytes + 4 + word as u64
        } else {
            order.unsigned(field(4 + word, word)?)
        };
        if let Some(value) = slice(bytes, place, length) {
            tags.push(Tag {
                number,
                kind,
                value,
                offset: place as usize,
            });
        }
    }
    let next = slice(bytes, first + count * entry_bytes, word as u64);
    Some((
        Directory {
            tags,
            order,
            offset,
        },
        next.map_or(0, |next| order.unsigned(next)),
    ))
}

impl<'a> Directory<'a> {
    /// A tag by its number.
    pub(super) fn tag(&self, number: u16) -> Option<Tag<'a>> {
        self.tags.iter().copied().find(|tag| tag.number == number)
    }

    /// A whole number.
    pub(super) fn whole(&self, number: u16) -> Option<u64> {
        let tag = self.tag(number)?;
        let size = bytes_of(tag.kind) as usize;
        matches!(tag.kind, 1 | 3 | 4 | 13 | 16)
            .then(|| tag.value.get(..size).map(|v| self.order.unsigned(v)))
            .flatten()
    }

    /// A positive fraction, as resolutions are stored.
    pub(super) fn fraction(&self, number: u16) -> Option<f64> {
        let tag = self.tag(number).filter(|tag| tag.kind == 5)?;
        let above = self.order.unsigned(tag.value.get(..4)?) as f64;
        let below = self.order.unsigned(tag.value.get(4..8)?) as f64;
        let value = above / below;
        (value.is_finite() && value > 0.0).then_some(value)
    }

    /// A text, UTF-8 or else Latin-1, without zeros at its end.
    pub(super) fn text(&self, number: u16) -> Option<String> {
        let tag = self
            .tag(number)
            .filter(|tag| matches!(tag.kind, 1 | 2 | 7))?;
        let end = tag.value.iter().rposition(|b| *b != 0).map_or(0, |i| i + 1);
        let value = tag.value.get(..end)?;
        Some(match std::str::from_utf8(value) {
            Ok(text) => text.to_owned(),
            Err(_) => value.iter().map(|&b| char::from(b)).collect(),
        })
    }

    /// All whole numbers of a tag.
    pub(super) fn wholes(&self, number: u16) -> Vec<u64> {
        let Some(tag) = self.tag(number).filter(|tag| matches!(tag.kind, 1 | 3 | 4)) else {
            return Vec::new();
        };
        let values = tag.value.chunks_exact(bytes_of(tag.kind) as usize);
        values.map(|v| self.order.unsigned(v)).collect()
    }

    /// A copy of the file that begins with this page and holds another whole number in one of its tags, for a
    /// decoder that is to read no other page.
    pub(super) fn as_first_page(&self, bytes: &[u8], change: Option<(u16, u16)>) -> Vec<u8> {
        let mut copy = bytes.to_vec();
        let mut write = |at: usize, length: usize, value: u64| {
            let little = value.to_le_bytes();
            let Some(place) = copy.get_mut(at..at.saturating_add(length)) else {
                return;
            };
            for (index, byte) in place.iter_mut().enumerate() {
                let from = if self.order.is_little {
                    index
                } else {
                    length - 1 - index
                };
                *byte = little.get(from).copied().unwrap_or(0);
            }
        };
        if self.order.is_big_tiff {
            write(8, 8, self.offset);
        } else {
            write(4, 4, self.offset);
        }
        if let Some((number, value)) = change
            && let Some(tag) = self.tag(number)
        {
            write(tag.offset, bytes_of(tag.kind) as usize, u64::from(value));
        }
        copy
    }
}

#[cfg(test)]
mod tests {
    use super::*;

    /// A little-endian file of one directory with entries given as number, kind, count, value.
    fn file(entries: &[(u16, u16, u32, [u8; 4])], next: u32, tail: &[u8]) -> Vec<u8> {
        let mut bytes = b"II*\0\x08\0\0\0".to_vec();
        bytes.extend((entries.len() as u16).to_le_bytes());
        for (number, kind, count, value) in entries {
            bytes.extend(number.to_le_bytes());
            bytes.extend(kind.to_le_bytes());
            bytes.extend(count.to_le_bytes());
            bytes.extend(value);
        }
        bytes.extend(next.to_le_bytes());
        bytes.extend(tail);
        bytes
    }

    #[test]
    fn values_inside_and_outside_the_entry_are_found() {
        let tail = [72, 0, 0, 0, 2, 0, 0, 0, b'5', b' ', 0xb5, b'm', 0];
        let bytes = file(
            &[
                (256, 3, 1, [5, 1, 0, 0]),
                (282, 5, 1, [50, 0, 0, 0]),
                (34118, 2, 5, [58, 0, 0, 0]),
                (999, 2, 5, [255, 255, 0, 0]),
            ],
            0,
            &tail,
        );
        let found = directories(&bytes).unwrap();
        assert!(!found.is_broken);
        let page = &found.pages[0];
        assert_eq!(page.whole(256), Some(261));
        assert_eq!(page.whole(257), None);
        // The tail begins after 8 + 2 + 4 * 12 + 4 bytes.
        assert_eq!(page.tag(282).map(|t| t.offset), Some(50));
        let moved = file(
            &[(282, 5, 1, [38, 0, 0, 0]), (34118, 2, 5, [46, 0, 0, 0])],
            0,
            &tail,
        );
        let found = directories(&moved).unwrap();
        let page = &found.pages[0];
        assert_eq!(page.fraction(282), Some(36.0));
        assert_eq!(page.text(34118).as_deref(), Some("5 \u{b5}m"));
    }

    #[test]
    fn pages_that_turn_back_end() {
        let bytes = file(&[(256, 3, 1, [5, 0, 0, 0])], 8, &[]);
        let found = directories(&bytes).unwrap();
        assert_eq!((found.pages.len(), found.is_broken), (1, true));
        let bytes = file(&[(256, 3, 1, [5, 0, 0, 0])], 7000, &[]);
        assert!(directories(&bytes).unwrap().is_broken);
    }

    #[test]
    fn hostile_counts_are_passed_over() {
        let bytes = file(
            &[
                (270, 2, u32::MAX, [8, 0, 0, 0]),
                (282, 5, u32::MAX, [8, 0, 0, 0]),
                (1, 99, 1, [0; 4]),
            ],
            0,
            &[],
        );
        assert!(directories(&bytes).unwrap().pages[0].tags.is_empty());
        for end in 0..bytes.len() {
            let _ = directories(&bytes[..end]);
        }
    }
}
