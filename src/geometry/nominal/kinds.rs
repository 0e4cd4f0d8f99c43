//! The table of kinds, their parameters and the modifiers: the single source for help, files and `draw`.

use std::fmt;

/// What a parameter is.
#[derive(Debug, Clone, Copy, PartialEq, Eq)]
#[non_exhaustive]
pub enum Quantity {
    /// A length: text with a unit.
    Length,
    /// An angle: text with `deg` or `rad`.
    Angle,
    /// A whole number.
    Count,
    /// A plain number.
    Ratio,
    /// A section inside the section.
    Spec,
    /// A list of sections.
    SpecList,
}

impl fmt::Display for Quantity {
    fn fmt(&self, f: &mut fmt::Formatter<'_>) -> fmt::Result {
        f.write_str(match self {
            Self::Length => "a length",
            Self::Angle => "an angle",
            Self::Count => "a whole number",
            Self::Ratio => "a plain number",
            Self::Spec => "a section",
            Self::SpecList => "a list of sections",
        })
    }
}

/// One kind of nominal section.
#[derive(Debug, Clone, Copy, PartialEq, Eq)]
pub struct KindInfo {
    /// Name, as written in files and commands.
    pub name: &'static str,
    /// One line: what it is and where its origin lies.
    pub summary: &'static str,
    /// Its parameters, in the order in which help shows them.
    pub parameters: &'static [ParameterInfo],
}

/// One parameter of a kind, or a modifier.
#[derive(Debug, Clone, Copy, PartialEq, Eq)]
pub struct ParameterInfo {
    /// Name, as written in files and commands.
    pub name: &'static str,
    /// What it means.
    pub meaning: &'static str,
    /// What it is.
    pub quantity: Quantity,
    /// Its value when left out, or in words what takes its place; `None` when it is required.
    pub default: Option<&'static str>,
    /// A value as it could be written.
    pub example: &'static str,
}

/// All kinds of nominal sections.
pub fn kinds() -> &'static [KindInfo] {
    KINDS
}

/// Parameters that every kind takes.
pub fn modifiers() -> &'static [ParameterInfo] {
    MODIFIERS
}

/// Parameters that a post takes beside those of its kind.
pub const fn post_parameters() -> &'static [ParameterInfo] {
    POST_PARAMETERS
}

/// A required parameter.
const fn required(
    name: &'static str,
    quantity: Quantity,
    meaning: &'static str,
    example: &'static str,
) -> ParameterInfo {
    ParameterInfo {
        name,
        meaning,
        quantity,
        default: None,
        example,
    }
}

/// A required length.
const fn length(name: &'static str, meaning: &'static str, example: &'static str) -> ParameterInfo {
    required(name, Quantity::Length, meaning, example)
}

/// A length that may be left out.
const fn length_else(
    name: &'static str,
    meaning: &'static str,
    default: &'static str,
    example: &'static str,
) -> ParameterInfo {
    ParameterInfo {
        name,
        meaning,
        quantity: Quantity::Length,
        default: Some(default),
        example,
    }
}

/// A required angle.
const fn angle(name: &'static str, meaning: &'static str, example: &'static str) -> ParameterInfo {
    required(name, Quantity::Angle, meaning, example)
}

static MODIFIERS: &[ParameterInfo] = &[
    length_else(
        "lid_sag",
        "how far the middle of an arched lid hangs into the section (circular arc; flat lid only)",
        "0 um",
        "3 um",
    ),
    length_else(
        "lid_bulge",
        "how far the middle of an arched lid stands out of the section (circular arc; flat lid only)",
        "0 um",
        "3 um",
    ),
    ParameterInfo {
        name: "posts",
        meaning: "posts in the section: closed shapes, each with the x and y of its centre of area",
        quantity: Quantity::SpecList,
        default: Some("none"),
        example: "[(circle diameter=10um x=0um y=-20um)]",
    },
];

const POST_PARAMETERS: &[ParameterInfo] = &[
    length(
        "x",
        "centre of area of the post, in the coordinates of the section",
        "0 um",
    ),
    length(
        "y",
        "centre of area of the post, in the coordinates of the section",
        "-20 um",
    ),
    ParameterInfo {
        name: "rotation",
        meaning: "turn of the post about its centre, anticlockwise",
        quantity: Quantity::Angle,
        default: Some("0 deg"),
        example: "45 deg",
    },
];

static KINDS: &[KindInfo] = &[
    KindInfo {
        name: "rectangle",
        summary: "rectangle under a flat lid; origin in the middle of the lid",
        parameters: &[
            length("width", "width", "100 um"),
            length("height", "height", "40 um"),
        ],
    },
    KindInfo {
        name: "trapezoid",
        summary: "flat floor, two straight walls, each at its own angle; origin in the middle of the lid",
        parameters: &[
            length("top_width", "width at the lid", "100 um"),
            length("depth", "depth below the lid", "40 um"),
            angle(
                "left_angle",
                "angle of the left wall from the horizontal: 90 deg is vertical, less narrows downwards, more undercuts",
                "88 deg",
            ),
            angle("right_angle", "the same for the right wall", "85 deg"),
        ],
    },
    KindInfo {
        name: "koh_groove",
        summary: "groove of a potassium hydroxide etch in (100) silicon, walls at atan(sqrt 2) = 54.7356 deg; \
                  closes to a V by itself at depth opening / sqrt 2; origin in the middle of the lid",
        parameters: &[
            length("opening", "width at the lid", "100 um"),
            length(
                "depth",
                "etched depth, if the walls do not meet before",
                "40 um",
            ),
        ],
    },
    KindInfo {
        name: "isotropic_etch",
        summary: "flat floor as wide as the mask opening, quarter-circle sides of radius depth, \
                  lid width mask opening + 2 depth; origin in the middle of the lid",
        parameters: &[
            length(
                "mask_opening",
                "opening of the mask; 0 um gives a half circle",
                "20 um",
            ),
            length("depth", "etched depth", "30 um"),
        ],
    },
    KindInfo {
        name: "bonded_halves",
        summary: "two grooves bonded face to face, the upper one mirrored up; origin in the middle of the lower opening, at its face",
        parameters: &[
            required(
                "lower",
                Quantity::Spec,
                "lower half: any section with a flat lid",
                "(isotropic_etch mask_opening=20um depth=30um)",
            ),
            required(
                "upper",
                Quantity::Spec,
                "upper half: any section with a flat lid, mirrored up",
                "(isotropic_etch mask_opening=20um depth=30um)",
            ),
            length_else(
                "offset",
                "shift of the upper half to the right, negative to the left; openings that do not overlap give two lumens",
                "0 um",
                "5 um",
            ),
            length_else(
                "gap",
                "height of a slab of fluid between the halves, from the outermost left to the outermost right edge of both openings",
                "0 um",
                "1 um",
            ),
        ],
    },
    KindInfo {
        name: "rounded_rectangle",
        summary: "rectangle with four corner radii; with both upper corners sharp it has a flat lid; origin in the middle of the top",
        parameters: &[
            length("width", "width", "100 um"),
            length("height", "height", "40 um"),
            length_else(
                "radius",
                "radius of all corners that are not given by themselves",
                "0 um",
                "8 um",
            ),
            length_else("radius_top_left", "radius of this corner", "radius", "0 um"),
            length_else(
                "radius_top_right",
                "radius of this corner",
                "radius",
                "0 um",
            ),
            length_else(
                "radius_bottom_left",
                "radius of this corner",
                "radius",
                "8 um",
            ),
            length_else(
                "radius_bottom_right",
                "radius of this corner",
                "radius",
                "8 um",
            ),
        ],
    },
    KindInfo {
        name: "stadium",
        summary: "half circles on the two short sides of a rectangle; origin at the centre",
        parameters: &[
            length("width", "overall width", "120 um"),
            length("height", "overall height", "40 um"),
        ],
    },
    KindInfo {
        name: "circle",
        summary: "circle; origin at the centre",
        parameters: &[length("diameter", "diameter", "100 um")],
    },
    KindInfo {
        name: "ellipse",
        summary: "ellipse; origin at the centre",
        parameters: &[
            length("width", "overall width", "120 um"),
            length("height", "overall height", "40 um"),
        ],
    },
    KindInfo {
        name: "half_ellipse",
        summary: "lower half of an ellipse under a flat lid; origin in the middle of the lid",
        parameters: &[
            length("width", "width at the lid", "120 um"),
            length("depth", "depth below the lid", "40 um"),
        ],
    },
    KindInfo {
        name: "circular_segment",
        summary: "part of a circle under a flat lid on the chord; origin in the middle of the lid",
        parameters: &[
            length(
                "depth",
                "depth below the lid, less than the diameter",
                "30 um",
            ),
            length_else(
                "radius",
                "radius of the circle",
                "from width and depth",
                "60 um",
            ),
            length_else(
                "width",
                "width at the lid, instead of the radius",
                "from radius and depth",
                "100 um",
            ),
        ],
    },
    KindInfo {
        name: "circular_sector",
        summary: "pie piece, symmetrical about the downward axis; origin at the apex",
        parameters: &[
            length("radius", "radius", "50 um"),
            angle("angle", "full angle at the apex, below 360 deg", "90 deg"),
        ],
    },
    KindInfo {
        name: "triangle",
        summary: "triangle, the base is the lid, the apex below; origin in the middle of the base",
        parameters: &[
            length("base", "width at the lid", "100 um"),
            angle(
                "left_angle",
                "inner angle at the left end of the base",
                "54.7356 deg",
            ),
            angle(
                "right_angle",
                "inner angle at the right end of the base",
                "54.7356 deg",
            ),
        ],
    },
    KindInfo {
        name: "triangle_height",
        summary: "triangle from base and height, the base is the lid, the apex below; origin in the middle of the base",
        parameters: &[
            length("base", "width at the lid", "100 um"),
            length("height", "depth of the apex below the lid", "60 um"),
            length_else(
                "apex_offset",
                "apex to the right of the middle of the base, negative to the left",
                "0 um",
                "10 um",
            ),
        ],
    },
    KindInfo {
        name: "triangle_sides",
        summary: "triangle from its three sides, side a is the lid; origin in the middle of side a",
        parameters: &[
            length("a", "side at the lid", "100 um"),
            length("b", "left side", "80 um"),
            length("c", "right side", "70 um"),
        ],
    },
    KindInfo {
        name: "regular_polygon",
        summary: "regular polygon with one side flat at the bottom; origin at the centre",
        parameters: &[
            required("sides", Quantity::Count, "number of sides, 3 to 1000", "6"),
            length_else("side", "length of a side", "from across_flats", "50 um"),
            length_else(
                "across_flats",
                "diameter of the inscribed circle, instead of the side",
                "from side",
                "90 um",
            ),
        ],
    },
    KindInfo {
        name: "drie_trench",
        summary: "trench of a deep reactive ion etch: taper, bow, scallops, rounded foot; origin in the middle of the lid",
        parameters: &[
            length(
                "top_width",
                "width at the lid, at the cusps of the scallops",
                "40 um",
            ),
            length("depth", "depth below the lid", "120 um"),
            ParameterInfo {
                name: "taper",
                meaning: "angle of the mean wall from the horizontal: 90 deg is vertical, less narrows downwards, more undercuts",
                quantity: Quantity::Angle,
                default: Some("90 deg"),
                example: "89.5 deg",
            },
            length_else(
                "bow",
                "parabolic outward bow of each wall, largest at mid-depth",
                "0 um",
                "1.5 um",
            ),
            length_else(
                "scallop_pitch",
                "height of one scallop; whole scallops from the lid down, what is left above the foot stays smooth",
                "0 um",
                "2 um",
            ),
            length_else(
                "scallop_depth",
                "depth of a scallop, a circular arc from cusp to cusp",
                "0 um",
                "0.2 um",
            ),
            length_else(
                "foot_radius",
                "radius between wall and floor",
                "0 um",
                "3 um",
            ),
        ],
    },
    KindInfo {
        name: "gaussian_groove",
        summary: "Gaussian profile, as of a laser-written groove, under a flat lid; origin in the middle of the lid",
        parameters: &[
            length("depth", "depth below the lid", "30 um"),
            length(
                "width",
                "full width where the untruncated profile has fallen to 1/e^2 of its depth",
                "80 um",
            ),
            ParameterInfo {
                name: "truncation",
                meaning: "the lid closes the profile where it has fallen to this fraction of its depth, 1e-9 to below 0.5",
                quantity: Quantity::Ratio,
                default: Some("0.01"),
                example: "0.02",
            },
        ],
    },
    KindInfo {
        name: "parabolic_groove",
        summary: "parabola under a flat lid; origin in the middle of the lid",
        parameters: &[
            length("width", "width at the lid", "100 um"),
            length("depth", "depth below the lid", "33 um"),
        ],
    },
    KindInfo {
        name: "annulus",
        summary: "space between two circles, concentric or not; origin at the centre of the outer circle",
        parameters: &[
            length("outer_diameter", "diameter of the outer wall", "100 um"),
            length("inner_diameter", "diameter of the inner wall", "50 um"),
            length_else(
                "offset",
                "centre of the inner circle to the right of the outer one, negative to the left",
                "0 um",
                "10 um",
            ),
        ],
    },
    KindInfo {
        name: "rhombus",
        summary: "rhombus, its long diagonal horizontal; origin at the centre",
        parameters: &[
            length("side", "length of a side", "60 um"),
            angle(
                "acute_angle",
                "the smaller inner angle, up to 90 deg",
                "70 deg",
            ),
        ],
    },
];
