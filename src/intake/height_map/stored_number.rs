//! The number types in which instruments store heights, lowest byte first.

/// A number type of a file.
#[derive(Debug, Clone, Copy, PartialEq, Eq)]
pub(super) enum StoredNumber {
    Unsigned8,
    Unsigned16,
    Unsigned32,
    Float32,
    Signed8,
    Signed16,
    Signed32,
    Float64,
}

impl StoredNumber {
    /// Size of one number, bytes.
    pub(super) fn bytes(self) -> usize {
        match self {
            Self::Unsigned8 | Self::Signed8 => 1,
            Self::Unsigned16 | Self::Signed16 => 2,
            Self::Unsigned32 | Self::Signed32 | Self::Float32 => 4,
            Self::Float64 => 8,
        }
    }

    /// Name for a person.
    pub(super) fn name(self) -> &'static str {
        match self {
            Self::Unsigned8 => "unsigned 8-bit integer",
            Self::Unsigned16 => "unsigned 16-bit integer",
            Self::Unsigned32 => "unsigned 32-bit integer",
            Self::Float32 => "32-bit floating point",
            Self::Signed8 => "8-bit integer",
            Self::Signed16 => "16-bit integer",
            Self::Signed32 => "32-bit integer",
            Self::Float64 => "64-bit floating point",
        }
    }

    /// Whether numbers are whole.
    pub(super) fn is_integer(self) -> bool {
        !matches!(self, Self::Float32 | Self::Float64)
    }

    /// Lowest number of the type.
    pub(super) fn lowest(self) -> f64 {
        match self {
            Self::Unsigned8 | Self::Unsigned16 | Self::Unsigned32 => 0.0,
            Self::Signed8 => f64::from(i8::MIN),
            Self::Signed16 => f64::from(i16::MIN),
            Self::Signed32 => f64::from(i32::MIN),
            Self::Float32 => f64::from(f32::MIN),
            Self::Float64 => f64::MIN,
        }
    }

    /// Highest number of the type.
    pub(super) fn highest(self) -> f64 {
        match self {
            Self::Unsigned8 => f64::from(u8::MAX),
            Self::Unsigned16 => f64::from(u16::MAX),
            Self::Unsigned32 => f64::from(u32::MAX),
            Self::Signed8 => f64::from(i8::MAX),
            Self::Signed16 => f64::from(i16::MAX),
            Self::Signed32 => f64::from(i32::MAX),
            Self::Float32 => f64::from(f32::MAX),
            Self::Float64 => f64::MAX,
        }
    }

    /// The number in the first bytes; NaN where there are too few.
    pub(super) fn decode(self, bytes: &[u8]) -> f64 {
        let number = match self {
            Self::Unsigned8 => bytes.first().map(|&b| f64::from(b)),
            Self::Signed8 => bytes.first().map(|&b| f64::from(b.cast_signed())),
            Self::Unsigned16 => first(bytes).map(|b| f64::from(u16::from_le_bytes(b))),
            Self::Signed16 => first(bytes).map(|b| f64::from(i16::from_le_bytes(b))),
            Self::Unsigned32 => first(bytes).map(|b| f64::from(u32::from_le_bytes(b))),
            Self::Signed32 => first(bytes).map(|b| f64::from(i32::from_le_bytes(b))),
            Self::Float32 => first(bytes).map(|b| f64::from(f32::from_le_bytes(b))),
            Self::Float64 => first(bytes).map(f64::from_le_bytes),
        };
        number.unwrap_or(f64::NAN)
    }
}

/// The first bytes as an array.
fn first<const N: usize>(bytes: &[u8]) -> Option<[u8; N]> {
    bytes.first_chunk().copied()
}
