//! The two ways a pair of rails is rectified, and what each does to diodes and windings.
//! Must not know waveforms: it combines figures of one rail into figures of parts.

use crate::physics::unit::{Amp, Volt};

/// How two windings feed two rails.
#[derive(Clone, Copy, Debug, PartialEq, Eq)]
pub enum Rectifier {
    /// One bridge across a centre-tapped winding, the centre tap at 0 V: every charging path has
    /// one diode, and each half winding charges the upper rail in one half-cycle and the lower in
    /// the next.
    CentreTap,
    /// A bridge for each winding, the direct-current sides in series: two diodes in every path, and
    /// each winding charges its own rail only.
    PerWinding,
}

impl Rectifier {
    /// Diode drop of one rail's charging path, for `diode` volts each.
    #[must_use]
    pub fn drop(self, diode: Volt) -> Volt {
        match self {
            Self::CentreTap => diode,
            Self::PerWinding => diode * 2.0,
        }
    }

    /// Secondary leads in one rail's charging path. The lead of a centre tap carries the difference
    /// of two equal currents and does not count.
    #[must_use]
    pub fn leads(self) -> f64 {
        match self {
            Self::CentreTap => 1.0,
            Self::PerWinding => 2.0,
        }
    }

    /// Greatest reverse voltage on one diode from the unloaded crests `upper` and `lower`, both
    /// positive: V0+ + V0- in one bridge on a centre tap, where a blocking diode stands between
    /// one rail and a winding end at the other; the greater V0 in a bridge per winding. The drop
    /// of the diode that conducts meanwhile is left out.
    #[must_use]
    pub fn reverse_peak(self, upper: Volt, lower: Volt) -> Volt {
        match self {
            Self::CentreTap => upper + lower,
            Self::PerWinding => upper.max(lower),
        }
    }

    /// R.m.s. currents of the two windings from those of the two rails' charging currents. On a
    /// centre tap each half winding carries both rails in turn, so both carry √((I+² + I-²)/2).
    #[must_use]
    pub fn winding_rms(self, upper: Amp, lower: Amp) -> (Amp, Amp) {
        match self {
            Self::CentreTap => {
                let rms = Amp((0.5 * (upper.0 * upper.0 + lower.0 * lower.0)).sqrt());
                (rms, rms)
            }
            Self::PerWinding => (upper, lower),
        }
    }
}
