//! Limits on what is read, checked before the work is done.

use super::read_error::ReadProblem;

/// Largest file that is read, bytes (512 MiB): several times an outline of the largest vertex count.
pub const MAX_FILE_BYTES: u64 = 512 << 20;
/// Largest section file or SVG drawing, bytes (64 MiB): their trees need many times the size of the text.
pub const MAX_MARKUP_BYTES: u64 = 64 << 20;
/// Largest number of vertices in one section.
pub const MAX_VERTICES: usize = 4_000_000;

/// Refuses a file above a limit.
pub(crate) fn check_file_size(bytes: u64, limit: u64) -> Result<(), ReadProblem> {
    if bytes > limit {
        return Err(ReadProblem::FileTooLarge { bytes, limit });
    }
    Ok(())
}

/// Refuses a section with too many vertices.
pub(crate) fn check_vertices(count: usize) -> Result<(), ReadProblem> {
    if count > MAX_VERTICES {
        return Err(ReadProblem::TooManyVertices {
            limit: MAX_VERTICES,
        });
    }
    Ok(())
}
