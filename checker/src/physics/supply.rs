//! The mains supply: transformer, rectifier, reservoirs, and what they do loaded, unloaded, at low
//! frequency, at switch-on and after switch-off.
//! Must not know amplifiers (a load is a current), fuses, or what is allowed.
//!
//! Two facts shorten everything here. While a rectifier conducts, the circuit is first order with a
//! sine source, so every piece has a closed form; while it does not, the reservoir falls in a
//! straight line. And a rail above zero never conducts at a zero crossing of the mains, where the
//! source is at minus the diode drop: conduction is one unbroken stretch inside each half-cycle.

mod conduction;
mod rail;
mod rectifier;
mod reservoir;
mod sag;
mod switch_on;
mod transformer;
#[cfg(test)]
mod twin;

pub use rail::{Cycle, Rail, RailParts, Sample};
pub use rectifier::Rectifier;
pub use reservoir::{
    Bleeder, Draw, Reservoir, RippleMultipliers, in_parallel, reservoir_ripple, ripple_shares,
    stored_energy,
};
pub use sag::{Headroom, LowFrequencyLoad, Scan};
pub use switch_on::{
    Closing, SoftStart, Surge, core_surge, soft_start, soft_surges, stuck_soft_start, switch_on,
};
pub use transformer::{
    Transformer, assumed_regulation, regulation_from_resistances, regulation_of_full_load,
};
