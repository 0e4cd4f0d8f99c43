//! Stretches of wall with names of their own.
//!
//! A stretch runs from the place of the wall nearest to one point to the place nearest to another, with the
//! fluid on the left: anticlockwise along an outer loop, clockwise round an island. Without the two points
//! it is the whole loop. Lengths in metres.

use super::outline::{Loop, Outline, Point};

/// Names that stand for the directions a wall faces; no stretch may take one.
pub const DIRECTION_NAMES: [&str; 4] = ["lid", "floor", "left", "right"];
/// Farthest that a point may lie from its loop, as a share of the loop's length.
pub const FARTHEST: f64 = 0.01;
/// Shortest stretch, and longest overlap that still counts as none, as a share of the loop's length.
const NO_LENGTH: f64 = 1e-6;

/// A named stretch as it is given.
#[derive(Debug, Clone, PartialEq)]
pub struct NamedWall {
    /// Its name.
    pub name: String,
    /// Number of the loop from 1, in the order of [`Outline::loops`].
    pub loop_number: usize,
    /// Points near its ends, m; `None` for the whole loop.
    pub ends: Option<[Point; 2]>,
}

/// A named stretch along its loop.
#[derive(Debug, Clone, PartialEq)]
pub struct WallStretch {
    /// Its name.
    pub name: String,
    /// Index of the loop, in the order of [`Outline::loops`].
    pub loop_index: usize,
    /// Arc length from the first vertex at which it begins, m.
    pub from: f64,
    /// Arc length at which it ends, m; larger than `from`, and beyond the length of the loop where the
    /// stretch runs past the first vertex.
    pub to: f64,
}

/// Why a named stretch cannot be used.
#[derive(Debug, Clone, PartialEq, thiserror::Error)]
#[non_exhaustive]
pub enum NamedWallError {
    /// The name is empty.
    #[error("the wall has no name")]
    NoName,
    /// The name stands for a direction.
    #[error("the wall name `{name}` stands for a direction and cannot be given")]
    DirectionName {
        /// The name.
        name: String,
    },
    /// Two stretches have one name.
    #[error("the wall name `{name}` is used twice")]
    UsedTwice {
        /// The name.
        name: String,
    },
    /// The loop does not exist.
    #[error("wall `{name}`: there is no loop {number}, the section has {loops}")]
    NoSuchLoop {
        /// The name.
        name: String,
        /// Number asked for.
        number: usize,
        /// Loops of the section.
        loops: usize,
    },
    /// An end lies off the wall.
    #[error(
        "wall `{name}`: `{end}` lies {:.4} \u{b5}m from loop {number}, more than {:.4} \u{b5}m",
        distance * 1e6, limit * 1e6
    )]
    OffTheWall {
        /// The name.
        name: String,
        /// `from` or `to`.
        end: &'static str,
        /// Number of the loop.
        number: usize,
        /// Distance, m.
        distance: f64,
        /// Largest distance allowed, m.
        limit: f64,
    },
    /// Both ends are at one place.
    #[error("wall `{name}`: `from` and `to` are at the same place of the wall")]
    NoLength {
        /// The name.
        name: String,
    },
    /// Two stretches share a part of the wall.
    #[error("the walls `{first}` and `{second}` overlap over {:.4} \u{b5}m", length * 1e6)]
    Overlap {
        /// The earlier one.
        first: String,
        /// The later one.
        second: String,
        /// Shared length, m.
        length: f64,
    },
}

impl NamedWallError {
    /// What to do.
    pub fn hint(&self) -> String {
        match self {
            Self::NoName => "write name = \"heated\", for example".to_owned(),
            Self::DirectionName { .. } => format!(
                "{} are the parts without a name of their own; take another, such as `cover`",
                DIRECTION_NAMES.join(", ")
            ),
            Self::UsedTwice { .. } => "give every [[wall]] a name of its own".to_owned(),
            Self::NoSuchLoop { .. } => {
                "loops count from 1: the outer loop of a lumen, then its islands".to_owned()
            }
            Self::OffTheWall { .. } => {
                "give a point on the wall, or the number of the loop that is meant".to_owned()
            }
            Self::NoLength { .. } => "leave out `from` and `to` to name the whole loop".to_owned(),
            Self::Overlap { .. } => {
                "stretches run with the fluid on the left: anticlockwise along an \
                 outer loop, clockwise round an island; perhaps `from` and `to` are exchanged"
                    .to_owned()
            }
        }
    }
}

/// The stretches of an outline that the named walls mean, in their order.
///
/// - `outline`: oriented (see [`Outline::oriented`])
///
/// # Errors
/// The index of the first wall that cannot be used, with the reason.
///
/// # Examples
/// ```
/// use etchwise::geometry::{NamedWall, Outline, wall_stretches};
/// let square = Outline::single(vec![[0.0, 0.0], [1.0, 0.0], [1.0, 1.0], [0.0, 1.0]]);
/// let heated = NamedWall {
///     name: "heated".to_owned(),
///     loop_number: 1,
///     ends: Some([[0.25, 0.0], [1.0, 0.5]]),
/// };
/// let found = wall_stretches(&square, &[heated]).unwrap();
/// assert!((found[0].from - 0.25).abs() < 1e-12 && (found[0].to - 1.5).abs() < 1e-12);
/// ```
pub fn wall_stretches(
    outline: &Outline,
    walls: &[NamedWall],
) -> Result<Vec<WallStretch>, (usize, NamedWallError)> {
    let mut found: Vec<WallStretch> = Vec::with_capacity(walls.len());
    for (index, wall) in walls.iter().enumerate() {
        let stretch = stretch(outline, wall).map_err(|error| (index, error))?;
        for earlier in &found {
            check_pair(outline, earlier, &stretch).map_err(|error| (index, error))?;
        }
        found.push(stretch);
    }
    Ok(found)
}

fn stretch(outline: &Outline, wall: &NamedWall) -> Result<WallStretch, NamedWallError> {
    let name = wall.name.clone();
    if name.trim().is_empty() {
        return Err(NamedWallError::NoName);
    }
    if DIRECTION_NAMES.contains(&name.trim().to_lowercase().as_str()) {
        return Err(NamedWallError::DirectionName { name });
    }
    let number = wall.loop_number;
    let along = number.checked_sub(1).and_then(|i| outline.loops().nth(i));
    let Some(along) = along else {
        let loops = outline.loops().count();
        return Err(NamedWallError::NoSuchLoop {
            name,
            number,
            loops,
        });
    };
    let length = along.length();
    let (from, to) = match wall.ends {
        None => (0.0, length),
        Some(ends) => {
            let limit = FARTHEST * length;
            let mut places = [0.0; 2];
            for (k, end) in ["from", "to"].into_iter().enumerate() {
                let (arc, distance) = nearest(along, ends[k]);
                if distance.is_nan() || distance > limit {
                    return Err(NamedWallError::OffTheWall {
                        name,
                        end,
                        number,
                        distance,
                        limit,
                    });
                }
                places[k] = if arc >= length { 0.0 } else { arc };
            }
            let span = (places[1] - places[0]).rem_euclid(length);
            if span.min(length - span) < NO_LENGTH * length {
                return Err(NamedWallError::NoLength { name });
            }
            (places[0], places[0] + span)
        }
    };
    Ok(WallStretch {
        name,
        loop_index: number - 1,
        from,
        to,
    })
}

/// Refuses two stretches with one name or a common part.
fn check_pair(
    outline: &Outline,
    first: &WallStretch,
    second: &WallStretch,
) -> Result<(), NamedWallError> {
    if first.name.trim() == second.name.trim() {
        return Err(NamedWallError::UsedTwice {
            name: second.name.clone(),
        });
    }
    if first.loop_index != second.loop_index {
        return Ok(());
    }
    let length = outline
        .loops()
        .nth(first.loop_index)
        .map_or(0.0, Loop::length);
    let shared: f64 = [-length, 0.0, length]
        .iter()
        .map(|turn| (first.to.min(second.to + turn) - first.from.max(second.from + turn)).max(0.0))
        .sum();
    if shared > NO_LENGTH * length {
        return Err(NamedWallError::Overlap {
            first: first.name.clone(),
            second: second.name.clone(),
            length: shared,
        });
    }
    Ok(())
}

/// Arc length of the place of a loop nearest to a point, and its distance, m.
fn nearest(wall: &Loop, p: Point) -> (f64, f64) {
    let (mut best, mut arc) = ((0.0, f64::INFINITY), 0.0);
    for (a, b) in wall.edges() {
        let (u, v) = ([b[0] - a[0], b[1] - a[1]], [p[0] - a[0], p[1] - a[1]]);
        let length = u[0].hypot(u[1]);
        if length > 0.0 {
            let t = ((u[0] * v[0] + u[1] * v[1]) / (length * length)).clamp(0.0, 1.0);
            let distance = (v[0] - t * u[0]).hypot(v[1] - t * u[1]);
            if distance < best.1 {
                best = (arc + t * length, distance);
            }
        }
        arc += length;
    }
    best
}

#[cfg(test)]
mod tests {
    use super::*;

    fn square() -> Outline {
        Outline::single(vec![[0.0, 0.0], [1.0, 0.0], [1.0, 1.0], [0.0, 1.0]])
    }

    fn wall(name: &str, ends: [Point; 2]) -> NamedWall {
        NamedWall {
            name: name.to_owned(),
            loop_number: 1,
            ends: Some(ends),
        }
    }

    #[test]
    fn a_stretch_may_run_past_the_first_vertex() {
        let found = wall_stretches(&square(), &[wall("a", [[0.0, 0.5], [0.5, 0.001]])]).unwrap();
        assert!((found[0].from - 3.5).abs() < 1e-12 && (found[0].to - 4.5).abs() < 1e-12);
    }

    #[test]
    fn every_misuse_is_named() {
        let bottom = wall("a", [[0.0, 0.0], [1.0, 0.0]]);
        let refused = |walls: &[NamedWall]| wall_stretches(&square(), walls).unwrap_err();
        let (index, error) = refused(&[bottom.clone(), wall("b", [[0.9, 0.0], [1.0, 0.5]])]);
        assert_eq!(index, 1);
        assert!(
            matches!(error, NamedWallError::Overlap { length, .. } if (length - 0.1).abs() < 1e-12)
        );
        // The other way round is the rest of the loop.
        let exchanged = wall("b", [[1.0, 1.0], [1.0, 0.0]]);
        assert!(matches!(
            refused(&[bottom.clone(), exchanged]).1,
            NamedWallError::Overlap { .. }
        ));
        assert!(matches!(
            refused(&[bottom.clone(), bottom.clone()]).1,
            NamedWallError::UsedTwice { .. }
        ));
        let off = wall("c", [[0.5, 0.5], [1.0, 0.0]]);
        assert!(matches!(
            refused(&[off]).1,
            NamedWallError::OffTheWall { end: "from", distance, .. } if (distance - 0.5).abs() < 1e-12
        ));
        let point = wall("c", [[0.5, 0.0], [0.5, 0.01]]);
        assert!(matches!(
            refused(&[point]).1,
            NamedWallError::NoLength { .. }
        ));
        assert!(matches!(
            refused(&[wall("Lid", [[0.0, 0.0], [1.0, 0.0]])]).1,
            NamedWallError::DirectionName { .. }
        ));
        let far = NamedWall {
            loop_number: 2,
            ..bottom
        };
        assert!(matches!(
            refused(&[far]).1,
            NamedWallError::NoSuchLoop { loops: 1, .. }
        ));
    }
}
