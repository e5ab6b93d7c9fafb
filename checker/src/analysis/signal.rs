//! The signals a build is judged by: full drive into each load, and the duty.
//! Must not know temperatures or ratings.

use super::case::{Case, Side};
use super::loads::Driven;
use super::rails::{Mains, Reservoir};
use crate::build::Needs;
use crate::build::parts::{both, three};
use crate::physics::load::Impedance;
use crate::physics::output_stage::{Drop, Signal, duty_amplitude, power};
use crate::physics::unit::{Amp, Ohm, Volt, Watt};

/// A 1 kHz sine into the load's nominal resistance, all channels, at a fraction of the power at clip.
#[derive(Clone, Copy, Debug)]
pub struct Duty {
    /// Fraction.
    pub fraction: f64,
    /// Peak of one channel's output voltage.
    pub amplitude: Volt,
    /// Peak current of one channel.
    pub peak: Amp,
    /// What one channel sees.
    pub load: Impedance,
    /// Mean power of one channel.
    pub power: Watt,
    /// Mean current on each rail of one supply, all its channels, idle included.
    pub rail_current: Amp,
}

impl Case<'_> {
    /// Drop from loaded rail to peak output.
    ///
    /// # Errors
    /// When it is not stated, or falls with current.
    pub fn drop(&self) -> Result<Drop, Needs> {
        let points = self.build.amplifier.drop.need()?;
        let points: Vec<(Amp, Volt)> = points
            .iter()
            .map(|(v, i)| (i.unwrap_or(Amp::ZERO), *v))
            .collect();
        Drop::new(&points).ok_or_else(|| {
            Needs::because("the drop of the amplifier must not fall as the current rises")
        })
    }

    /// V(burst): the peak output on the unsagged rail into a modulus that one channel sees.
    ///
    /// # Errors
    /// What rails or drop lack, or that the drop takes all of the rail.
    pub fn burst(&self, mains: Mains, modulus: Ohm) -> Result<Volt, Needs> {
        let (rail, drop) = both(self.unsagged(mains), self.drop())?;
        drop.burst(rail, modulus).ok_or_else(|| {
            Needs::because(format!("the drop takes all of the {:.1} V rail", rail.0))
        })
    }

    /// The greatest peak current of one channel into a load, unsagged rail, and the output then.
    ///
    /// # Errors
    /// As [`Case::burst`].
    pub fn greatest_current(&self, mains: Mains, load: &Driven) -> Result<(Volt, Amp), Needs> {
        let modulus = load.minimum_seen().seen.modulus();
        let volts = self.burst(mains, modulus)?;
        Ok((volts, volts / modulus))
    }

    /// Mean current on each rail of one supply while every channel plays a sine of this peak current.
    ///
    /// # Errors
    /// What the output stage or the build does not state.
    pub fn rail_current(&self, peak: Amp) -> Result<Amp, Needs> {
        let (idle, pairs, channels) = three(
            self.idle(),
            self.output().pairs.need().copied(),
            self.channels_per_supply(),
        )?;
        Ok((peak / crate::physics::math::PI + idle * f64::from(pairs)) * f64::from(channels))
    }

    /// The duty signal in a load: amplitude √(2·d·Pref·R), Pref the greater of the power claimed into
    /// that resistance and V(burst)²/2R.
    ///
    /// # Errors
    /// What rails, drop, output stage or build do not state.
    pub fn duty_signal(&self, load: &Driven) -> Result<Duty, Needs> {
        self.signal_at(load, self.duty().fraction)
    }

    /// The same at another fraction of the power at clip.
    ///
    /// # Errors
    /// As [`Case::duty_signal`].
    pub fn signal_at(&self, load: &Driven, fraction: f64) -> Result<Duty, Needs> {
        let resistance = load.nominal_seen();
        let clip = self.burst(Mains::Nominal, resistance)?;
        let claimed = self
            .claimed_into(load.nominal)
            .map_or(Watt::ZERO, |w| if load.bridged { w / 2.0 } else { w });
        let reference = claimed.max(power(clip, resistance));
        let amplitude = duty_amplitude(fraction, reference, resistance)
            .ok_or_else(|| Needs::because("the duty signal cannot be worked out"))?;
        let peak = amplitude / resistance;
        let rail_current = self.rail_current(peak)?;
        Ok(Duty {
            fraction,
            amplitude,
            peak,
            load: Impedance::resistive(resistance),
            power: power(amplitude, resistance),
            rail_current,
        })
    }

    /// The greater mean rail of the two ends of the capacitors' tolerance: it makes the most heat.
    ///
    /// # Errors
    /// As [`Case::loaded`].
    pub fn mean_rail(&self, mains: Mains, current: Amp) -> Result<Volt, Needs> {
        let low = self.loaded(mains, Reservoir::Low, current)?.mean;
        let high = self.loaded(mains, Reservoir::High, current)?.mean;
        Ok(low.max(high))
    }

    /// The greatest power claimed into this resistance.
    #[must_use]
    pub fn claimed_into(&self, resistance: Ohm) -> Option<Watt> {
        let claims = self.build.amplifier.rated.get()?;
        let same = claims
            .iter()
            .filter(|c| (c.load / resistance - 1.0).abs() < 0.02);
        same.map(|c| c.power).reduce(Watt::max)
    }

    /// A sine as the output stage sees it.
    ///
    /// # Errors
    /// When the load is not passive.
    pub fn sine(&self, amplitude: Volt, load: Impedance) -> Result<Signal, Needs> {
        Signal::sine(amplitude, load).ok_or_else(|| Needs::because("the load is not passive"))
    }

    /// How much more than its even part the most loaded device of a side carries.
    ///
    /// # Errors
    /// What the output stage does not state.
    pub fn share(&self, side: Side, bank_current: Amp) -> Result<f64, Needs> {
        Ok(self.bench()?.bank(side).share(bank_current))
    }
}
