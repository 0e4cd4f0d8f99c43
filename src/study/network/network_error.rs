//! Why a net has no solution.

/// Why a net has no solution.
#[derive(Debug, Clone, PartialEq, thiserror::Error)]
#[non_exhaustive]
pub enum NetworkError {
    /// No channel.
    #[error("the net has no channel")]
    Empty,
    /// A channel with numbers that make none.
    #[error("channel `{channel}`: {problem}")]
    Channel {
        /// Its name.
        channel: String,
        /// What is wrong.
        problem: &'static str,
    },
    /// No channel ends at a node.
    #[error("no channel ends at node `{node}`: it floats")]
    Floating {
        /// Place of the node.
        index: usize,
        /// Its name.
        node: String,
    },
    /// A part of the net that no pressure is given for.
    #[error(
        "no pressure is given in the part of the net with node `{node}` ({nodes} nodes in all): its pressures \
         are anything"
    )]
    NoPressure {
        /// Place of the first node of the part.
        index: usize,
        /// Its name.
        node: String,
        /// Nodes of the part.
        nodes: usize,
    },
    /// A card without a law at another temperature.
    #[error(
        "card `{card}` holds at {} only and has no law over temperature; the net is at {temperature} K",
        own.map_or_else(|| "one temperature that it does not state".to_owned(), |own| format!("{own} K"))
    )]
    NoLaw {
        /// Its name.
        card: String,
        /// Its temperature, K.
        own: Option<f64>,
        /// Temperature of the net, K.
        temperature: f64,
    },
    /// A temperature outside the law of a card.
    #[error(
        "the net is at {temperature} K; the law of card `{card}` holds from {low} K to {high} K"
    )]
    OutsideLaw {
        /// Name of the card.
        card: String,
        /// Temperature of the net, K.
        temperature: f64,
        /// Lowest temperature of the law, K.
        low: f64,
        /// Highest temperature of the law, K.
        high: f64,
    },
    /// Cards at different temperatures, and no temperature of the net.
    #[error("cards `{first}` and `{second}` are made at different temperatures")]
    MixedTemperatures {
        /// Name of a card.
        first: String,
        /// Name of another.
        second: String,
    },
    /// Resistances so far apart that they leave the range of numbers.
    #[error("the resistances of the net leave the range of numbers")]
    OutOfRange,
    /// A net that needs more memory than there is for it.
    #[error("the net is so densely meshed that its solution needs more than {links} links")]
    TooLarge {
        /// Most links.
        links: usize,
    },
}

impl NetworkError {
    /// What to do about it.
    pub fn hint(&self) -> &'static str {
        match self {
            Self::Empty => "add a [[channel]] between two nodes",
            Self::Channel { .. } => {
                "lengths and resistances are above zero, the two ends are different nodes"
            }
            Self::Floating { .. } => "join it by a [[channel]], or take it out",
            Self::NoPressure { .. } => {
                "give one of these nodes a pressure, for example pressure = \"0 Pa\", or join it by a channel to \
                 a node that has one"
            }
            Self::NoLaw { .. } => {
                "leave `temperature` out of the net, or make the card at that temperature"
            }
            Self::OutsideLaw { .. } => {
                "make the card again with a wider range, for example `etchwise card FILE --temperature-range \
                 5C..80C`"
            }
            Self::MixedTemperatures { .. } => {
                "give the net a temperature, for example temperature = \"25 C\""
            }
            Self::OutOfRange => "check lengths and cards: some channel is closed or has no length",
            Self::TooLarge { .. } => "solve it in parts",
        }
    }
}
