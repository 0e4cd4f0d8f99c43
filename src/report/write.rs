//! Writing files: beside the target first, renamed at the end, nothing left on failure.
//!
//! The only module that touches files for writing. A target is checked before the long work
//! ([`check_target`]), and an input file is never overwritten.
#![expect(
    clippy::disallowed_methods,
    reason = "this is the one module that writes files"
)]

use std::ffi::OsString;
use std::fs::{self, OpenOptions};
use std::io::{self, Write};
use std::path::{Path, PathBuf};
use std::sync::atomic::{AtomicU64, Ordering};

/// Why a file could not be written.
#[derive(Debug, thiserror::Error)]
#[non_exhaustive]
pub enum WriteError {
    /// The target is one of the input files.
    #[error("`{}` is an input file and is not overwritten; name another output", path.display())]
    IsInput {
        /// The target.
        path: PathBuf,
    },
    /// A dash where a file is needed.
    #[error("`-` names no file here: standard output takes the main result only; name a file")]
    IsDash,
    /// The target is a folder.
    #[error("`{}` is a folder; name a file in it", path.display())]
    IsFolder {
        /// The target.
        path: PathBuf,
    },
    /// The target exists and is read-only.
    #[error("`{}` exists and is read-only; make it writable or name another output", path.display())]
    ReadOnly {
        /// The target.
        path: PathBuf,
    },
    /// Two outputs of one run have the same target.
    #[error("`{}` is named for two outputs of one run; give each its own name", path.display())]
    NamedTwice {
        /// The target.
        path: PathBuf,
    },
    /// The folder of the target does not exist.
    #[error("the folder of `{}` does not exist; create it first", path.display())]
    NoFolder {
        /// The target.
        path: PathBuf,
    },
    /// The system refused.
    #[error("`{}` cannot be written: {source}", path.display())]
    Refused {
        /// The target.
        path: PathBuf,
        /// What the system says.
        source: io::Error,
    },
}

/// One file to write.
#[derive(Debug, Clone, Copy)]
pub struct OutputFile<'a> {
    /// Where to.
    pub path: &'a Path,
    /// What.
    pub bytes: &'a [u8],
}

/// The `.vti` and `.vtp` paths of a prefix; a dot in the prefix is kept.
///
/// # Examples
/// ```
/// let [field, wall] = etchwise::report::vtk_paths("out/run1.2".as_ref());
/// assert_eq!(field, std::path::Path::new("out/run1.2.vti"));
/// assert_eq!(wall, std::path::Path::new("out/run1.2.vtp"));
/// ```
pub fn vtk_paths(prefix: &Path) -> [PathBuf; 2] {
    [".vti", ".vtp"].map(|extension| with_extension(prefix, extension))
}

/// The `.vtk` path of a prefix, for the field in the old format.
pub fn legacy_vtk_path(prefix: &Path) -> PathBuf {
    with_extension(prefix, ".vtk")
}

fn with_extension(prefix: &Path, extension: &str) -> PathBuf {
    let mut name = OsString::from(prefix);
    name.push(extension);
    PathBuf::from(name)
}

/// Checks that `path` can be written and is none of `inputs`, without changing it.
///
/// A file is created beside it and removed again, so that a full run does not end at a locked folder.
///
/// # Errors
/// [`WriteError`] with the path and the reason.
pub fn check_target(path: &Path, inputs: &[&Path]) -> Result<(), WriteError> {
    let target = resolve(path, inputs)?;
    if let Target::Plain(real) = target {
        let temporary = Temporary::create(path, &real)?;
        drop(temporary);
    }
    Ok(())
}

/// Checks targets of one run as [`check_target`] does, and that no two are the same file.
///
/// # Errors
/// [`WriteError`] with the path and the reason.
pub fn check_targets(paths: &[&Path], inputs: &[&Path]) -> Result<(), WriteError> {
    let mut seen = Vec::new();
    for path in paths {
        if let Target::Plain(real) = resolve(path, inputs)? {
            if seen.contains(&real) {
                return Err(WriteError::NamedTwice {
                    path: (*path).to_owned(),
                });
            }
            seen.push(real);
        }
    }
    paths.iter().try_for_each(|path| check_target(path, inputs))
}

/// Writes one file; see [`write_files`].
///
/// # Errors
/// [`WriteError`] with the path and the reason; an existing target is then unchanged.
pub fn write_file(path: &Path, bytes: &[u8], inputs: &[&Path]) -> Result<(), WriteError> {
    write_files(&[OutputFile { path, bytes }], inputs)
}

/// Writes files that belong together: all beside their targets first, then all renamed.
///
/// Devices and pipes such as `/dev/stdout` are written directly.
///
/// # Errors
/// [`WriteError`] with the path and the reason. Up to the first rename every target is unchanged and
/// nothing is left beside it.
pub fn write_files(files: &[OutputFile<'_>], inputs: &[&Path]) -> Result<(), WriteError> {
    let mut plain: Vec<(PathBuf, &OutputFile<'_>)> = Vec::new();
    let mut direct = Vec::new();
    for file in files {
        match resolve(file.path, inputs)? {
            Target::Plain(real) if plain.iter().any(|(other, _)| *other == real) => {
                return Err(WriteError::NamedTwice {
                    path: file.path.to_owned(),
                });
            }
            Target::Plain(real) => plain.push((real, file)),
            Target::Device => direct.push(file),
        }
    }
    let mut ready = Vec::new();
    for (real, file) in &plain {
        let mut temporary = Temporary::create(file.path, real)?;
        temporary.fill(file)?;
        ready.push(temporary);
    }
    for file in direct {
        write_to_device(file).map_err(|source| refused(file.path, source))?;
    }
    for (temporary, (real, file)) in ready.into_iter().zip(&plain) {
        temporary
            .rename_to(real)
            .map_err(|source| refused(file.path, source))?;
    }
    Ok(())
}

/// What a path leads to.
enum Target {
    /// A file, existing or new, with links resolved.
    Plain(PathBuf),
    /// A device or pipe.
    Device,
}

fn refused(path: &Path, source: io::Error) -> WriteError {
    WriteError::Refused {
        path: path.to_owned(),
        source,
    }
}

/// Follows links and refuses what must not or cannot be a target.
fn resolve(path: &Path, inputs: &[&Path]) -> Result<Target, WriteError> {
    let owned = || path.to_owned();
    if path == Path::new("-") {
        return Err(WriteError::IsDash);
    }
    let metadata = match fs::metadata(path) {
        Ok(metadata) => metadata,
        Err(e) if e.kind() == io::ErrorKind::NotFound => return new_target(path),
        Err(e) => return Err(refused(path, e)),
    };
    if metadata.is_dir() {
        return Err(WriteError::IsFolder { path: owned() });
    }
    if !metadata.is_file() {
        return Ok(Target::Device);
    }
    let real = fs::canonicalize(path).map_err(|e| refused(path, e))?;
    let is_input =
        |input: &&Path| fs::canonicalize(input).is_ok_and(|i| i == real) || same_file(input, &real);
    if inputs.iter().any(is_input) {
        return Err(WriteError::IsInput { path: owned() });
    }
    if metadata.permissions().readonly() {
        return Err(WriteError::ReadOnly { path: owned() });
    }
    Ok(Target::Plain(real))
}

/// A target that does not exist yet: its folder must. A link to a file that does not exist is followed.
fn new_target(path: &Path) -> Result<Target, WriteError> {
    if let Ok(linked) = fs::read_link(path) {
        let folder = path.parent().unwrap_or(Path::new(""));
        return new_target(&folder.join(linked));
    }
    let Some(name) = path.file_name() else {
        return Err(WriteError::IsFolder {
            path: path.to_owned(),
        });
    };
    if path
        .as_os_str()
        .to_string_lossy()
        .ends_with(std::path::is_separator)
    {
        return Err(WriteError::IsFolder {
            path: path.to_owned(),
        });
    }
    let folder = match path.parent() {
        Some(parent) if !parent.as_os_str().is_empty() => parent,
        _ => Path::new("."),
    };
    match fs::canonicalize(folder) {
        Ok(real) if real.is_dir() => Ok(Target::Plain(real.join(name))),
        Ok(_) => Err(WriteError::NoFolder {
            path: path.to_owned(),
        }),
        Err(e) if e.kind() == io::ErrorKind::NotFound => Err(WriteError::NoFolder {
            path: path.to_owned(),
        }),
        Err(e) => Err(refused(path, e)),
    }
}

/// Whether two paths are names of the same file (hard links).
#[cfg(unix)]
fn same_file(a: &Path, b: &Path) -> bool {
    use std::os::unix::fs::MetadataExt;
    match (fs::metadata(a), fs::metadata(b)) {
        (Ok(a), Ok(b)) => a.dev() == b.dev() && a.ino() == b.ino(),
        _ => false,
    }
}

/// Elsewhere only resolved paths are compared.
#[cfg(not(unix))]
fn same_file(_: &Path, _: &Path) -> bool {
    false
}

fn write_to_device(file: &OutputFile<'_>) -> io::Result<()> {
    let mut device = OpenOptions::new().write(true).open(file.path)?;
    device.write_all(file.bytes)?;
    device.flush()
}

/// A file beside the target that is removed unless it is renamed.
struct Temporary {
    path: PathBuf,
    file: Option<fs::File>,
    renamed: bool,
}

impl Temporary {
    /// Creates the file in the folder of `real`; `path` is what errors name.
    fn create(path: &Path, real: &Path) -> Result<Self, WriteError> {
        static COUNT: AtomicU64 = AtomicU64::new(0);
        let n = COUNT.fetch_add(1, Ordering::Relaxed);
        let beside = real.with_file_name(format!(".etchwise-{}-{n}.partial", std::process::id()));
        let file = OpenOptions::new()
            .write(true)
            .create_new(true)
            .open(&beside)
            .map_err(|e| refused(path, e))?;
        Ok(Self {
            path: beside,
            file: Some(file),
            renamed: false,
        })
    }

    /// Writes the bytes through to the disk.
    fn fill(&mut self, output: &OutputFile<'_>) -> Result<(), WriteError> {
        let failed = |e| refused(output.path, e);
        if let Some(mut file) = self.file.take() {
            file.write_all(output.bytes).map_err(failed)?;
            file.sync_all().map_err(failed)?;
        }
        Ok(())
    }

    /// Puts the file in the place of `real`, keeping the permissions of a file that was there.
    fn rename_to(mut self, real: &Path) -> io::Result<()> {
        if let Ok(old) = fs::metadata(real) {
            fs::set_permissions(&self.path, old.permissions())?;
        }
        fs::rename(&self.path, real)?;
        self.renamed = true;
        Ok(())
    }
}

impl Drop for Temporary {
    fn drop(&mut self) {
        self.file = None;
        if !self.renamed {
            // Nothing more can be done about a file that cannot be removed; the run has failed already.
            let _ = fs::remove_file(&self.path);
        }
    }
}
