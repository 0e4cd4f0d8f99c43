//! Where the answer for a net stops holding: laminar limit, entrance, pressure, and the short cautions.

use super::net::Network;
use super::solution::{BeyondLimit, ChannelState, NetworkSolution};
use crate::warning::{Code, Warning};

/// Density below which a fluid can only be a gas, kg/m^3.
const GAS_DENSITY: f64 = 50.0;
/// Temperature from which a fluid can scald, K (60 C).
const HOT: f64 = 333.15;

impl NetworkSolution {
    /// Whether any channel is beyond the laminar limit of its card: the numbers do not describe the flow there.
    pub fn is_outside_validity(&self) -> bool {
        let mut channels = self.channels.iter();
        channels.any(|channel| channel.beyond.contains(&BeyondLimit::Reynolds))
    }

    /// Warnings about the use of a solved net, one of each kind with the worst channel, then the cautions.
    pub fn warnings(&self, network: &Network) -> Vec<Warning> {
        let mut all = Vec::new();
        all.extend(self.laminar(network));
        all.extend(self.entrance(network));
        all.extend(self.pressure(network));
        all.extend(self.not_checked(network));
        let is_gas = |density: Option<f64>| density.is_some_and(|d| d < GAS_DENSITY);
        if network.cards.iter().any(|card| is_gas(card.density)) {
            all.push(caution(
                "The fluid is a gas: compressibility and slip are not checked here, and compressed gas stores energy, \
                 so that a chip or fitting that fails throws its pieces.",
                "Keep pressure drops below a tenth of the absolute pressure, proof test with liquid, limit the \
                 pressure, and shield the set-up.",
            ));
        }
        if self.temperature.is_some_and(|t| t >= HOT) {
            all.push(caution(
                "Hot fluid scalds, and heat weakens bonds, polymers and fittings.",
                "Check the temperature limits of chip and fittings.",
            ));
        }
        all.push(caution(
            "The net holds for rigid sections: channels in soft elastomers widen under pressure, and their resistance \
             then falls with it. Losses in junctions, bends and fittings are not in it.",
            "For soft walls measure the section under pressure; add the resistance of fittings as channels of their \
             own.",
        ));
        all
    }

    /// Channels beyond a limit: how many, and the one that is largest by `size`.
    fn worst(
        &self,
        limit: BeyondLimit,
        size: impl Fn(&ChannelState) -> f64,
    ) -> Option<(usize, usize)> {
        let mut beyond = 0;
        let mut worst: Option<usize> = None;
        for (index, channel) in self.channels.iter().enumerate() {
            if channel.beyond.contains(&limit) {
                beyond += 1;
                if worst.is_none_or(|other| size(channel) > size(&self.channels[other])) {
                    worst = Some(index);
                }
            }
        }
        worst.map(|index| (beyond, index))
    }

    fn laminar(&self, network: &Network) -> Option<Warning> {
        let reynolds = |channel: &ChannelState| channel.reynolds.unwrap_or(0.0);
        let (count, index) = self.worst(BeyondLimit::Reynolds, reynolds)?;
        let channel = &network.channels[index];
        let found = reynolds(&self.channels[index]);
        let limit = network.cards[channel.card].limits.reynolds.unwrap_or(0.0);
        Some(Warning {
            code: Code::NotLaminar,
            message: format!(
                "In {count} of {} channels the Reynolds number on the hydraulic diameter is above the limit of the \
                 card; it is largest in `{}`, {found:.0} against {limit:.0}: the flow is not laminar there and the \
                 numbers do not describe it.",
                self.channels.len(),
                channel.name
            ),
            advice: "Lower the pressures or flows, or use a friction law for turbulent flow."
                .to_owned(),
            numbers: vec![
                ("channels", count as f64),
                ("reynolds_dh", found),
                ("limit", limit),
            ],
        })
    }

    fn entrance(&self, network: &Network) -> Option<Warning> {
        let share = |index: usize| {
            let length = network.channels[index].length;
            let length = length.or(network.cards[network.channels[index].card].length);
            self.channels[index]
                .entrance_length
                .zip(length)
                .map_or(0.0, |(entrance, length)| entrance / length)
        };
        let beyond: Vec<usize> = (0..self.channels.len())
            .filter(|&index| self.channels[index].beyond.contains(&BeyondLimit::Entrance))
            .collect();
        let &worst = beyond
            .iter()
            .max_by(|&&a, &&b| share(a).total_cmp(&share(b)))?;
        Some(Warning {
            code: Code::EntranceLength,
            message: format!(
                "In {} of {} channels the entrance takes more of the length than the card allows; most in `{}`, \
                 {:.0} %: the true pressure drop is higher there.",
                beyond.len(),
                self.channels.len(),
                network.channels[worst].name,
                100.0 * share(worst)
            ),
            advice: "Add the entrance pressure to the drop, or use longer channels or lower flows."
                .to_owned(),
            numbers: vec![
                ("channels", beyond.len() as f64),
                ("entrance_share", share(worst)),
            ],
        })
    }

    fn pressure(&self, network: &Network) -> Option<Warning> {
        let size = |channel: &ChannelState| channel.pressure_drop.abs();
        let (count, index) = self.worst(BeyondLimit::PressureDrop, size)?;
        let found = size(&self.channels[index]);
        Some(Warning {
            code: Code::FluidRange,
            message: format!(
                "In {count} of {} channels the pressure drop is above that up to which the properties of the fluid \
                 hold; it is largest in `{}`, {found:.3e} Pa.",
                self.channels.len(),
                network.channels[index].name
            ),
            advice: "Lower the pressures, or make cards with the properties at the mean pressure."
                .to_owned(),
            numbers: vec![("channels", count as f64), ("pressure_drop_pa", found)],
        })
    }

    /// Channels without a Reynolds number or a limit for it.
    fn not_checked(&self, network: &Network) -> Option<Warning> {
        let is_open = |(index, channel): (usize, &ChannelState)| {
            let card = &network.cards[network.channels[index].card];
            channel.reynolds.is_none() || card.limits.reynolds.is_none()
        };
        let count = self
            .channels
            .iter()
            .enumerate()
            .filter(|&one| is_open(one))
            .count();
        (count > 0).then(|| {
            caution(
                &format!(
                    "In {count} of {} channels the Reynolds number and the entrance length are not checked: the card \
                     has no density, length or limit.",
                    self.channels.len()
                ),
                "Make the card with the density of the fluid.",
            )
        })
    }
}

fn caution(message: &str, advice: &str) -> Warning {
    Warning {
        code: Code::Caution,
        message: message.to_owned(),
        advice: advice.to_owned(),
        numbers: Vec::new(),
    }
}
