//! The zip container of an x3p file, read within limits.

use std::io::{Cursor, Read};

use zip::ZipArchive;

use super::file_defects::FileDefects;
use super::map_problem::MapProblem;

/// Largest file in a container, bytes, as declared and as it comes out (1 GiB).
const MAX_ENTRY_BYTES: u64 = 1 << 30;
/// Size from which the ratio of packing is looked at, bytes.
const RATIO_CHECKED_FROM: u64 = 64 << 20;
/// Largest ratio of unpacked to packed size beyond that. Measured heights pack some 2 to 20 times; the
/// method itself ends near 1000.
const MAX_RATIO: u64 = 400;
/// Bytes unpacked at a time.
const CHUNK_BYTES: usize = 1 << 16;
/// Name of the description of an x3p file.
pub(super) const MAIN_XML: &str = "main.xml";

/// An open container.
#[derive(Debug)]
pub(super) struct Container<'a> {
    archive: ZipArchive<Cursor<&'a [u8]>>,
    /// Paths of the entries with forward slashes, in the order of the archive.
    names: Vec<String>,
    /// Folder of `main.xml` with its slash; empty at the top.
    folder: String,
    /// Place of `main.xml`.
    main: usize,
}

impl<'a> Container<'a> {
    /// Opens a container and finds its `main.xml`.
    pub(super) fn open(bytes: &'a [u8], defects: &mut FileDefects) -> Result<Self, MapProblem> {
        let archive =
            ZipArchive::new(Cursor::new(bytes)).map_err(|error| MapProblem::Container {
                message: error.to_string(),
            })?;
        let names: Vec<String> = (0..archive.len()).map(|at| name_of(&archive, at)).collect();
        let added = names.iter().filter(|name| is_added(name)).count();
        if added > 0 {
            defects.note(format!(
                "the container holds {added} entries that an archiver or file manager added \
                 (`__MACOSX`, `.DS_Store` and the like); they were passed over"
            ));
        }
        let depth = |at: &usize| names.get(*at).map_or(0, |name| name.matches('/').count());
        let mains: Vec<usize> = (0..names.len())
            .filter(|&at| {
                names.get(at).is_some_and(|name| {
                    !is_added(name) && last_part(name).eq_ignore_ascii_case(MAIN_XML)
                })
            })
            .collect();
        let Some(main) = mains.iter().copied().min_by_key(depth) else {
            return Err(MapProblem::EntryMissing {
                name: MAIN_XML.to_owned(),
            });
        };
        let path = names.get(main).map_or("", String::as_str);
        let folder = path.strip_suffix(last_part(path)).unwrap_or("").to_owned();
        if !folder.is_empty() {
            defects.note(format!(
                "everything lies in the folder `{}` of the container instead of at its top",
                folder.trim_end_matches('/')
            ));
        }
        if mains.len() > 1 {
            defects.note(format!(
                "the container holds {} files named main.xml; `{path}` was read",
                mains.len()
            ));
        }
        Ok(Self {
            archive,
            names,
            folder,
            main,
        })
    }

    /// The bytes of `main.xml`, at most `limit`.
    pub(super) fn main_xml(&mut self, limit: u64) -> Result<Vec<u8>, MapProblem> {
        self.read_whole(self.main, limit)
    }

    /// The place of a file that `main.xml` links to.
    pub(super) fn find(&self, link: &str, defects: &mut FileDefects) -> Option<usize> {
        let link = link.replace('\\', "/");
        let link = link.trim_start_matches("./").trim_start_matches('/');
        let wanted = format!("{}{link}", self.folder);
        if let Some(at) = self.names.iter().position(|name| *name == wanted) {
            return Some(at);
        }
        let near = self.names.iter().position(|name| {
            !is_added(name)
                && (name.eq_ignore_ascii_case(&wanted)
                    || last_part(name).eq_ignore_ascii_case(last_part(link)))
        })?;
        defects.note(format!(
            "`main.xml` names `{link}`; the container holds it as `{}`",
            self.names.get(near).map_or("", String::as_str)
        ));
        Some(near)
    }

    /// All bytes of an entry, at most `limit`.
    pub(super) fn read_whole(&mut self, at: usize, limit: u64) -> Result<Vec<u8>, MapProblem> {
        let mut whole = Vec::new();
        self.stream(at, limit, |chunk| {
            whole.extend_from_slice(chunk);
            true
        })?;
        Ok(whole)
    }

    /// Hands an entry over in chunks until `take` wants no more.
    pub(super) fn stream(
        &mut self,
        at: usize,
        limit: u64,
        mut take: impl FnMut(&[u8]) -> bool,
    ) -> Result<(), MapProblem> {
        let name = self.names.get(at).cloned().unwrap_or_default();
        let limit = limit.min(MAX_ENTRY_BYTES);
        let damaged = |message: String| MapProblem::Entry {
            name: name.clone(),
            message,
        };
        let mut entry = self
            .archive
            .by_index(at)
            .map_err(|error| damaged(error.to_string()))?;
        let packed = entry.compressed_size().max(1);
        if entry.size() > limit {
            return Err(MapProblem::EntryTooLarge { name, limit });
        }
        let mut chunk = vec![0; CHUNK_BYTES];
        let mut total: u64 = 0;
        loop {
            let count = match entry.read(&mut chunk) {
                Ok(0) => return Ok(()),
                Ok(count) => count,
                Err(error) if error.kind() == std::io::ErrorKind::Interrupted => continue,
                Err(error) => return Err(damaged(error.to_string())),
            };
            total += count as u64;
            if total > limit {
                return Err(MapProblem::EntryTooLarge { name, limit });
            }
            if total > RATIO_CHECKED_FROM && total / packed > MAX_RATIO {
                return Err(MapProblem::EntryRatio {
                    name,
                    ratio: MAX_RATIO,
                });
            }
            if !take(chunk.get(..count).unwrap_or_default()) {
                return Ok(());
            }
        }
    }
}

/// Whether an archive holds a `main.xml`; `None` where it cannot be opened.
pub(super) fn holds_main_xml(bytes: &[u8]) -> Option<bool> {
    let archive = ZipArchive::new(Cursor::new(bytes)).ok()?;
    Some((0..archive.len()).any(|at| {
        let name = name_of(&archive, at);
        !is_added(&name) && last_part(&name).eq_ignore_ascii_case(MAIN_XML)
    }))
}

/// Path of an entry with forward slashes.
fn name_of(archive: &ZipArchive<Cursor<&[u8]>>, at: usize) -> String {
    match archive.name_for_index(at) {
        Some(Ok(name)) => name.replace('\\', "/"),
        _ => String::new(),
    }
}

/// The part of a path after its last slash.
fn last_part(path: &str) -> &str {
    path.rsplit('/').next().unwrap_or(path)
}

/// Whether an entry was added by an archiver or a file manager.
fn is_added(path: &str) -> bool {
    let last = last_part(path);
    path.split('/').any(|part| part == "__MACOSX")
        || last.starts_with("._")
        || [".DS_Store", "Thumbs.db", "desktop.ini"]
            .iter()
            .any(|name| last.eq_ignore_ascii_case(name))
}
