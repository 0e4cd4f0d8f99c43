//! What can be wrong with the file of a net and with the cards that it names.

/// What is wrong with the file of a net, or with a card that it names.
#[derive(Debug, Clone, PartialEq, thiserror::Error)]
#[non_exhaustive]
pub enum NetworkProblem {
    /// The text is not TOML.
    #[error("not valid TOML: {message}")]
    Toml {
        /// What the TOML reader says.
        message: String,
    },
    /// A list that must have entries has none.
    #[error("the net has no [[{what}]]")]
    None {
        /// `card`, `node` or `channel`.
        what: &'static str,
    },
    /// A name that is empty or too long.
    #[error("a name needs 1 to {limit} characters; this one has {found}")]
    NameLength {
        /// Characters found.
        found: usize,
        /// Most characters.
        limit: usize,
    },
    /// A name that comes a second time.
    #[error("the name `{name}` is taken by the {what} in line {line}")]
    Duplicate {
        /// `card`, `node` or `channel`.
        what: &'static str,
        /// The name.
        name: String,
        /// Line of the first one.
        line: usize,
    },
    /// A name that nothing has.
    #[error("there is no {what} `{name}`")]
    Unknown {
        /// `card` or `node`.
        what: &'static str,
        /// The name.
        name: String,
        /// The nearest name that there is.
        nearest: Option<String>,
    },
    /// A channel from a node to itself.
    #[error("the channel begins and ends at node `{node}`")]
    SelfLoop {
        /// The node.
        node: String,
    },
    /// A pressure and an inflow at one node.
    #[error("the node has both a pressure and an inflow")]
    TwoConditions,
    /// A length that is zero or negative.
    #[error("the length `{text}` is not above zero")]
    NotPositive {
        /// The text.
        text: String,
    },
    /// A value that no channel has.
    #[error("`{text}` is beyond {limit}")]
    TooLarge {
        /// The text.
        text: String,
        /// The limit.
        limit: &'static str,
    },
    /// A relative uncertainty outside 0 to 100 %.
    #[error("the relative uncertainty `{text}` is not from 0 up to below 100 %")]
    NotAShare {
        /// The text.
        text: String,
    },
    /// A number of channels side by side that is none.
    #[error("`parallel` is a whole number from 1 to 1000000")]
    Parallel,
    /// A channel with the card of a section and no length.
    #[error(
        "the channel has no `length`; card `{card}` is that of a section and holds for one metre"
    )]
    LengthNeeded {
        /// The card.
        card: String,
    },
    /// A channel with the card of a route and a length.
    #[error("card `{card}` is that of a route, which has its own length")]
    LengthRefused {
        /// The card.
        card: String,
    },
    /// Several cards in a file, and none chosen.
    #[error("the file has {} cards: {}", names.len(), first_names(names))]
    SeveralCards {
        /// Their names.
        names: Vec<String>,
    },
    /// No such card in a file.
    #[error("the file has no card `{name}`; it has {}", first_names(names))]
    NoSuchCard {
        /// The name.
        name: String,
        /// The names that there are.
        names: Vec<String>,
    },
    /// Cards of different fluids.
    #[error("card `{card}` is for {fluid}, card `{first}` for {first_fluid}")]
    Fluids {
        /// A card.
        card: String,
        /// Its fluid.
        fluid: String,
        /// The first card.
        first: String,
        /// Its fluid.
        first_fluid: String,
    },
    /// Standard input named as the file of a card.
    #[error("a card cannot come from standard input")]
    StandardInput,
    /// The text is not JSON.
    #[error("not valid JSON: {message}")]
    Json {
        /// What the JSON reader says.
        message: String,
    },
    /// A file of another kind or of another version.
    #[error("`schema` is {found}; cards have \"etchwise-card/1\"")]
    Schema {
        /// What it is.
        found: String,
    },
    /// A key of a card that cannot be used.
    #[error("`{key}`: {problem}")]
    CardKey {
        /// The key with its way from the top.
        key: String,
        /// What is wrong.
        problem: String,
    },
}

impl NetworkProblem {
    /// What the user can do.
    pub fn hint(&self) -> String {
        match self {
            Self::Unknown {
                nearest: Some(name),
                ..
            } => format!("did you mean `{name}`?"),
            Self::Unknown { what, .. } => format!("add a [[{what}]] with that name"),
            Self::None { what } => format!("add a [[{what}]]"),
            Self::SeveralCards { names } => format!(
                "choose one, for example card = \"{}\"",
                names.first().map_or("", String::as_str)
            ),
            other => other.fixed_hint().to_owned(),
        }
    }

    fn fixed_hint(&self) -> &'static str {
        match self {
            Self::Toml { .. } => "correct the line; texts and values with a unit stand in quotes",
            Self::NameLength { .. } => "give a short name",
            Self::Duplicate { .. } => "give each its own name",
            Self::SelfLoop { .. } => "name two different nodes in `from` and `to`",
            Self::TwoConditions => "keep one of the two: the other follows from it",
            Self::NotPositive { .. } => "write for example length = \"20 mm\"",
            Self::TooLarge { .. } => "check the number and its unit",
            Self::NotAShare { .. } => "write for example \"3 %\"",
            Self::Parallel => "write for example parallel = 4, or leave it out for one channel",
            Self::LengthNeeded { .. } => "add for example length = \"20 mm\"",
            Self::LengthRefused { .. } => "take `length` out",
            Self::NoSuchCard { .. } => "check the spelling of `card`",
            Self::Fluids { .. } => "make all cards of a net with the same fluid by `etchwise card`",
            Self::StandardInput => "name a file made by `etchwise card SECTION --json -o FILE`",
            Self::Json { .. } | Self::Schema { .. } | Self::CardKey { .. } => {
                "make the card again by `etchwise card SECTION --fluid water --temperature 25C --json -o FILE`"
            }
            _ => "see the README for the form of a net",
        }
    }
}

/// The first names of a list.
fn first_names(names: &[String]) -> String {
    let shown: Vec<String> = names.iter().take(6).map(|n| format!("`{n}`")).collect();
    let more = if names.len() > 6 { ", ..." } else { "" };
    format!("{}{more}", shown.join(", "))
}
