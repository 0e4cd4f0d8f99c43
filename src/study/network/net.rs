//! What a net is made of: cards, nodes, channels. SI units throughout.

use crate::flow::TemperatureLaw;

/// What the coefficients of a card belong to.
#[derive(Debug, Clone, Copy, PartialEq, Eq)]
pub enum CardExtent {
    /// One metre of channel: the card of a section.
    PerLength,
    /// A whole channel: the card of a route.
    Whole,
}

/// Up to where a card holds; `None` where it says nothing.
#[derive(Debug, Clone, Copy, PartialEq, Default)]
pub struct NetCardLimits {
    /// Largest Reynolds number on the hydraulic diameter.
    pub reynolds: Option<f64>,
    /// Share of the length that the entrance may take.
    pub entrance_share: Option<f64>,
    /// Largest pressure drop, Pa.
    pub pressure_drop: Option<f64>,
}

/// The coefficients of a card as a net uses them, each for one metre or for the whole channel (`extent`).
#[derive(Debug, Clone, PartialEq)]
pub struct NetCard {
    /// Name in the net.
    pub name: String,
    /// What the coefficients belong to.
    pub extent: CardExtent,
    /// Resistance at the card's own temperature, Pa s/m^4 or Pa s/m^3.
    pub resistance: f64,
    /// Its proven range.
    pub proven: Option<(f64, f64)>,
    /// Inertance, kg/m^5 or kg/m^4.
    pub inertance: Option<f64>,
    /// Volume, m^2 or m^3.
    pub volume: f64,
    /// Wetted wall, m or m^2.
    pub wall_area: f64,
    /// Length of the channel of a whole card, m.
    pub length: Option<f64>,
    /// Mean wall shear per flow rate, Pa s/m^3.
    pub shear_mean: Option<f64>,
    /// Largest wall shear per flow rate, Pa s/m^3.
    pub shear_max: Option<f64>,
    /// Standard relative uncertainty of the resistance that the card states.
    pub own_uncertainty: Option<f64>,
    /// Number of the card that it comes from: cards of a net with the same number are one and the same card, so their own
    /// uncertainty moves together.
    pub origin: usize,
    /// Further standard relative uncertainty that all channels of the card have in common.
    pub common_uncertainty: f64,
    /// Up to where the card holds.
    pub limits: NetCardLimits,
    /// Temperature of the card, K.
    pub temperature: Option<f64>,
    /// Viscosity of the fluid there, Pa s.
    pub viscosity: f64,
    /// Density of the fluid there, kg/m^3.
    pub density: Option<f64>,
    /// Resistance over temperature.
    pub law: Option<TemperatureLaw>,
}

impl NetCard {
    /// Standard relative uncertainty that all channels of the card have in common: its own and the further
    /// one, in quadrature.
    pub fn common(&self) -> f64 {
        self.own_uncertainty
            .unwrap_or(0.0)
            .hypot(self.common_uncertainty)
    }
}

/// What is given at a node.
#[derive(Debug, Clone, Copy, PartialEq)]
pub enum NodeCondition {
    /// A pressure, Pa.
    Pressure(f64),
    /// A flow into the net, m^3/s; negative for one out of it, zero where channels only meet.
    Inflow(f64),
}

/// A place where channels meet.
#[derive(Debug, Clone, PartialEq)]
pub struct NetNode {
    /// Name.
    pub name: String,
    /// What is given there.
    pub condition: NodeCondition,
}

/// One channel, or several equal ones side by side.
#[derive(Debug, Clone, PartialEq)]
pub struct NetChannel {
    /// Name.
    pub name: String,
    /// Node where it begins: its place in [`Network::nodes`].
    pub from: usize,
    /// Node where it ends.
    pub to: usize,
    /// Its place in [`Network::cards`].
    pub card: usize,
    /// Length, m; for a section's card, and only there.
    pub length: Option<f64>,
    /// Equal channels side by side, at least 1.
    pub parallel: u32,
    /// Standard relative uncertainty of the resistance of each single channel, independent of all others.
    pub spread: f64,
}

/// A net of channels.
#[derive(Debug, Clone, PartialEq)]
pub struct Network {
    /// Name.
    pub name: String,
    /// Name of the fluid in all channels.
    pub fluid: String,
    /// Temperature of the net, K; `None` for that of the cards.
    pub temperature: Option<f64>,
    /// Cards.
    pub cards: Vec<NetCard>,
    /// Nodes.
    pub nodes: Vec<NetNode>,
    /// Channels.
    pub channels: Vec<NetChannel>,
}
