//! Two grooves bonded face to face, with a lateral offset and a gap.
//!
//! The lower half's face lies at `y = 0`, the upper half is mirrored up from `y = gap`. Without a gap the
//! fluid connects where the openings overlap and the bare faces beside them are walls; openings that do
//! not overlap make two lumens, each closed by the face of the other half. With a gap a slab of that height
//! runs from the outermost left to the outermost right edge of both openings and ends there: the gap of a
//! real bond goes on beyond, but nothing flows along the channel there to speak of.

use super::NominalError;
use super::lid::no_flat_lid;
use super::parameters::Parameters;
use super::shape::{Shape, Wall};
use crate::geometry::{Loop, Lumen, Outline, Point};

/// Openings whose overlap is below this fraction of the narrower one neither overlap nor part.
const TOUCHING: f64 = 1e-9;

/// One half in place: wall from the left to the right end of its opening, and its posts.
struct Half {
    wall: Vec<Point>,
    islands: Vec<Loop>,
    left: f64,
    right: f64,
}

/// Lower and upper half, offset and gap.
pub(super) fn bonded_halves(p: &Parameters<'_>) -> Result<Shape, NominalError> {
    let offset = p.signed_length("offset")?;
    let gap = p.length_or_zero("gap")?;
    let (lower, upper) = (half(p, "lower")?, half(p, "upper")?);
    let middle = f64::midpoint(lower.left, lower.right);
    let lower = lower.moved(|q| [q[0] - middle, q[1]]);
    let shift = offset - f64::midpoint(upper.left, upper.right);
    let upper = upper.moved(|q| [q[0] + shift, gap - q[1]]);
    let narrower = (lower.right - lower.left).min(upper.right - upper.left);
    let overlap = lower.right.min(upper.right) - lower.left.max(upper.left);
    if gap <= 0.0 && overlap.abs() <= TOUCHING * narrower {
        let advice = (
            ", where the openings just touch",
            "let the openings overlap or part, or give a gap",
        );
        return Err(p.refuse("offset", offset, "other than", offset, advice));
    }
    let outline = if gap <= 0.0 && overlap < 0.0 {
        apart(lower, upper)
    } else {
        joined(lower, upper, gap, narrower)
    };
    Ok(Shape {
        kind: p.kind(),
        outline,
        flat_lid: false,
    })
}

impl Half {
    /// The half with its points moved.
    fn moved(self, place: impl Fn(Point) -> Point) -> Self {
        let all = |points: Vec<Point>| points.into_iter().map(&place).collect::<Vec<_>>();
        Self {
            left: place([self.left, 0.0])[0],
            right: place([self.right, 0.0])[0],
            wall: all(self.wall),
            islands: self
                .islands
                .into_iter()
                .map(|island| Loop::new(all(island.points)))
                .collect(),
        }
    }
}

/// The named half in its own coordinates.
fn half(p: &Parameters<'_>, name: &'static str) -> Result<Half, NominalError> {
    let shape = p.nested(name)?;
    let Some((left, right)) = shape.lid() else {
        return Err(NominalError::Nested {
            place: format!("`{name}`"),
            source: Box::new(no_flat_lid(shape.kind, "bonded_halves")),
        });
    };
    let lumen = shape.outline.lumens.into_iter().next();
    let (wall, islands) = lumen.map_or_else(Default::default, |l| (l.outer.points, l.islands));
    Ok(Half {
        wall,
        islands,
        left: left[0],
        right: right[0],
    })
}

/// Two lumens.
fn apart(lower: Half, upper: Half) -> Outline {
    let lumens = [lower, upper]
        .map(|half| Lumen {
            outer: Loop::new(half.wall),
            islands: half.islands,
        })
        .into();
    Outline { lumens }.oriented()
}

/// One lumen: lower wall left to right, slab, upper wall right to left, slab.
fn joined(lower: Half, upper: Half, gap: f64, narrower: f64) -> Outline {
    let (left, right) = (lower.left.min(upper.left), lower.right.max(upper.right));
    let smaller = if gap > 0.0 {
        gap.min(narrower)
    } else {
        narrower
    };
    let mut wall = Wall::from(lower.wall.first().copied().unwrap_or([left, 0.0]), smaller);
    for &q in lower.wall.iter().skip(1) {
        wall.line_to(q);
    }
    if gap > 0.0 {
        wall.line_to([right, 0.0]);
        wall.line_to([right, gap]);
    }
    for &q in upper.wall.iter().rev() {
        wall.line_to(q);
    }
    if gap > 0.0 {
        wall.line_to([left, gap]);
        wall.line_to([left, 0.0]);
    }
    let mut islands = lower.islands;
    islands.extend(upper.islands);
    Outline {
        lumens: vec![Lumen {
            outer: Loop::new(wall.closed()),
            islands,
        }],
    }
    .oriented()
}
