//! From cards and channels to resistances: temperature, length, channels side by side.

use super::net::{CardExtent, NetCard, NetChannel, Network};
use super::network_error::NetworkError;

/// Temperatures closer than this are the same, K.
const SAME_TEMPERATURE: f64 = 1e-6;

/// Numbers of one channel at the temperature of the net, all channels side by side together.
#[derive(Debug, Clone, Copy, PartialEq)]
pub(super) struct Element {
    /// Pa s/m^3.
    pub(super) resistance: f64,
    /// Its proven range.
    pub(super) proven: Option<(f64, f64)>,
    /// kg/m^4.
    pub(super) inertance: Option<f64>,
    /// m^3.
    pub(super) volume: f64,
    /// m.
    pub(super) length: Option<f64>,
    /// Pa s.
    pub(super) viscosity: f64,
    /// `R(T) / R(T0)` of its card.
    pub(super) factor: f64,
}

/// The temperature of a net, K, and `R(T) / R(T0)` of each card.
pub(super) fn temperature_factors(
    network: &Network,
) -> Result<(Option<f64>, Vec<f64>), NetworkError> {
    let first = network.cards.first();
    let Some(temperature) = network.temperature else {
        let own = first.and_then(|card| card.temperature);
        let is_same = |card: &&NetCard| match (own, card.temperature) {
            (Some(a), Some(b)) => (a - b).abs() <= SAME_TEMPERATURE,
            (None, None) => true,
            _ => false,
        };
        if let (Some(first), Some(second)) = (first, network.cards.iter().find(|c| !is_same(c))) {
            return Err(NetworkError::MixedTemperatures {
                first: first.name.clone(),
                second: second.name.clone(),
            });
        }
        return Ok((own, vec![1.0; network.cards.len()]));
    };
    let factors = network
        .cards
        .iter()
        .map(|card| factor(card, temperature))
        .collect::<Result<_, _>>()?;
    Ok((Some(temperature), factors))
}

fn factor(card: &NetCard, temperature: f64) -> Result<f64, NetworkError> {
    let own = card.temperature;
    if own.is_some_and(|own| (own - temperature).abs() <= SAME_TEMPERATURE) {
        return Ok(1.0);
    }
    let Some(law) = &card.law else {
        return Err(NetworkError::NoLaw {
            card: card.name.clone(),
            own,
            temperature,
        });
    };
    if !(law.low..=law.high).contains(&temperature) {
        return Err(NetworkError::OutsideLaw {
            card: card.name.clone(),
            temperature,
            low: law.low,
            high: law.high,
        });
    }
    Ok(law.factor(temperature))
}

/// The numbers of every channel.
pub(super) fn elements(network: &Network, factors: &[f64]) -> Result<Vec<Element>, NetworkError> {
    network
        .channels
        .iter()
        .map(|channel| {
            element(network, channel, factors).map_err(|problem| NetworkError::Channel {
                channel: channel.name.clone(),
                problem,
            })
        })
        .collect()
}

fn element(
    network: &Network,
    channel: &NetChannel,
    factors: &[f64],
) -> Result<Element, &'static str> {
    let nodes = network.nodes.len();
    if channel.from >= nodes || channel.to >= nodes {
        return Err("an end is no node of the net");
    }
    if channel.from == channel.to {
        return Err("it begins and ends at the same node");
    }
    let card = network.cards.get(channel.card).ok_or("it has no card")?;
    let factor = factors.get(channel.card).copied().unwrap_or(1.0);
    if channel.parallel == 0 {
        return Err("there are none side by side");
    }
    let is_positive = |v: f64| v.is_finite() && v > 0.0;
    let times = match (card.extent, channel.length) {
        (CardExtent::Whole, None) => 1.0,
        (CardExtent::Whole, Some(_)) => return Err("the card of a route has its own length"),
        (CardExtent::PerLength, Some(length)) if is_positive(length) => length,
        (CardExtent::PerLength, Some(_)) => return Err("its length is not above zero"),
        (CardExtent::PerLength, None) => return Err("it has no length"),
    };
    let count = f64::from(channel.parallel);
    let scale = factor * times / count;
    let resistance = card.resistance * scale;
    if !(is_positive(resistance) && is_positive(1.0 / resistance)) {
        return Err("its resistance is zero, negative, or out of the range of numbers");
    }
    if !(is_positive(card.volume) && is_positive(card.wall_area)) {
        return Err("its card has no volume or no wall");
    }
    Ok(Element {
        resistance,
        proven: card.proven.map(|(low, high)| (low * scale, high * scale)),
        inertance: card.inertance.map(|i| i * times / count),
        volume: card.volume * times * count,
        length: channel.length.or(card.length),
        viscosity: card.viscosity * factor,
        factor,
    })
}
