//! A net of channels: flows and pressures, and how sure they are.
//!
//! Channels with the resistances of their cards join nodes; at a node either the pressure or the flow into the net is
//! given. Solved directly by taking out one node after the other (`elimination`), without any subtraction of
//! conductances, and checked by the balance of mass at every node. The uncertainty of the cards, common to all
//! channels of one card, and the spread of single channels are carried to the results to first order and by samples.
//! SI units; tests in `tests/network.rs`.

mod elements;
mod elimination;
mod linear;
mod net;
mod network_error;
mod random;
mod samples;
mod solution;
mod structure;
mod topology;
mod uncertainty;
mod warnings;

pub use net::{CardExtent, NetCard, NetCardLimits, NetChannel, NetNode, Network, NodeCondition};
pub use network_error::NetworkError;
pub use random::NormalSource;
pub use solution::{
    BALANCE_TOLERANCE, BeyondLimit, ChannelState, EquivalentResistance, MassBalance,
    NetworkSolution, NodeState,
};
pub use uncertainty::{
    DEFAULT_SAMPLES, FEWEST_SAMPLES, NetOutput, NetworkUncertainty, OutputUncertainty,
    SampleOptions, Sampled,
};
