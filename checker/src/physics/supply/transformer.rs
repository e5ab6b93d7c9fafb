//! The mains transformer: what its rating plate says, turned into a source voltage and a source
//! resistance of one secondary winding.
//! Must not know rectifiers, reservoirs, or where a figure was stated.

use crate::physics::math::{SQRT_2, ln, straight_lines};
use crate::physics::unit::{Amp, Hertz, Ohm, Volt};

/// A transformer with equal secondary windings, on one primary tap. A centre-tapped secondary is
/// two windings.
///
/// Holds only values that make sense: see [`Transformer::new`].
#[derive(Clone, Copy, Debug, PartialEq)]
pub struct Transformer {
    tap: f64,
    winding: f64,
    windings: f64,
    rating_va: f64,
    regulation: f64,
}

impl Transformer {
    /// A transformer from its rating plate.
    ///
    /// `tap`: r.m.s. voltage of the primary tap in use; `winding`: r.m.s. voltage Vs of ONE
    /// secondary winding with every winding at its rated current; `windings`: how many such
    /// windings; `rating_va`: volt-amperes of the whole transformer; `regulation`: ρ = (no-load -
    /// rated)/rated, so 0.06 for 6 % of full load.
    ///
    /// `None` unless all are finite and positive, the regulation lying in (0, 1].
    #[must_use]
    pub fn new(
        tap: Volt,
        winding: Volt,
        windings: u32,
        rating_va: f64,
        regulation: f64,
    ) -> Option<Self> {
        let positive = [tap.0, winding.0, f64::from(windings), rating_va, regulation]
            .iter()
            .all(|q| q.is_finite() && *q > 0.0);
        (positive && regulation <= 1.0).then_some(Self {
            tap: tap.0,
            winding: winding.0,
            windings: f64::from(windings),
            rating_va,
            regulation,
        })
    }

    /// Rated loaded r.m.s. voltage Vs of one winding.
    #[must_use]
    pub fn winding(&self) -> Volt {
        Volt(self.winding)
    }

    /// Regulation ρ = (no-load - rated)/rated.
    #[must_use]
    pub fn regulation(&self) -> f64 {
        self.regulation
    }

    /// Secondary-to-primary turns ratio of one winding: a = Vs(1 + ρ)/Vtap.
    ///
    /// The no-load voltage is what the turns give; the rated voltage is already less by the copper.
    #[must_use]
    pub fn turns_ratio(&self) -> f64 {
        self.winding * (1.0 + self.regulation) / self.tap
    }

    /// Crest of one winding with no current: V0 = m·√2·Vs·(1 + ρ), where `mains` is m = mains
    /// voltage / tap voltage. No diode drop is taken off.
    #[must_use]
    pub fn no_load_crest(&self, mains: f64) -> Volt {
        Volt(mains * SQRT_2 * self.winding * (1.0 + self.regulation))
    }

    /// Rated r.m.s. current of one winding: VA/(windings·Vs).
    #[must_use]
    pub fn rated_current(&self) -> Amp {
        Amp(self.rating_va / (self.windings * self.winding))
    }

    /// Rated r.m.s. current of the primary: VA/Vtap (magnetising current and losses left out).
    #[must_use]
    pub fn rated_primary_current(&self) -> Amp {
        Amp(self.rating_va / self.tap)
    }

    /// Volt-amperes drawn from one winding that carries `rms`: Vs·Irms, at the RATED voltage, because
    /// the rating stands for a heating of the copper and not for a voltage.
    #[must_use]
    pub fn va_used(&self, rms: Amp) -> f64 {
        self.winding * rms.0
    }

    /// What one winding that carries `rms` adds to the mains current: Irms·Vs(1 + ρ)/Vtap.
    ///
    /// The sum over windings is the mains r.m.s. where all windings carry pulses of one shape at
    /// one time, which holds for balanced rails; otherwise the sum is the greater (Minkowski).
    #[must_use]
    pub fn primary_current(&self, rms: Amp) -> Amp {
        rms * self.turns_ratio()
    }

    /// Source resistance of one winding when ALL windings carry the same current:
    /// Rs = ρ·Vs/Irated = ρ·Vs²/(VA/windings).
    ///
    /// It holds the winding's own copper and its share of the common primary, which drops the sum
    /// of all currents. With one winding alone it is less (0.75 Rs for two windings and copper
    /// split evenly), so this is the higher, deliberately, wherever rails draw unequally.
    /// Leakage inductance is left out; on toroids it matters little (common practice, no source).
    #[must_use]
    pub fn winding_resistance(&self) -> Ohm {
        Ohm(self.regulation * self.winding * self.winding * self.windings / self.rating_va)
    }

    /// Copper resistance of the primary when none is stated: half of ρ·Vtap²/VA.
    ///
    /// ρ·Vtap²/VA is the whole copper seen from the primary; half each is the least-copper design
    /// (common practice, no source).
    #[must_use]
    pub fn assumed_primary_resistance(&self) -> Ohm {
        Ohm(0.5 * self.regulation * self.tap * self.tap / self.rating_va)
    }

    /// A resistance in the primary circuit, seen from one of `conducting` windings that carry the
    /// same current at the same time: n·a²·R.
    ///
    /// Each winding sends a·i into the primary, so the primary carries n·a·i and loses n·a·i·R,
    /// which every winding sees as n·a²·i·R. Both rails of a symmetrical supply charge at once, so
    /// n counts the windings of every transformer behind that resistance.
    #[must_use]
    pub fn referred(&self, primary_side: Ohm, conducting: u32) -> Ohm {
        let ratio = self.turns_ratio();
        primary_side * (f64::from(conducting) * ratio * ratio)
    }

    /// Peak flux against the flux at rated mains and frequency: (Vmains/Vtap)·(f rated/f), `mains`
    /// being Vmains/Vtap. A core designed close to its plate nears saturation not far above 1
    /// (common practice, no source).
    #[must_use]
    pub fn core_flux(mains: f64, rated: Hertz, actual: Hertz) -> f64 {
        mains * (rated / actual)
    }
}

/// Regulation of full load from regulation of no load: ρ = x/(1 - x), where
/// x = (no-load - rated)/no-load. `None` unless 0 < x < 1/2 (ρ below 1).
#[must_use]
pub fn regulation_of_full_load(of_no_load: f64) -> Option<f64> {
    (of_no_load > 0.0 && of_no_load < 0.5).then(|| of_no_load / (1.0 - of_no_load))
}

/// Regulation ρ from measured copper: primary `primary` (at the tap in use) and `secondary` of one
/// winding.
///
/// At rated current k = Irated/Vs each winding loses ρ = k·Rsec + k·n·Rpri·a² of its rated voltage,
/// with the turns ratio a = Vs(1 + ρ)/Vtap; that is a quadratic in ρ,
/// ρ = A + B(1 + ρ)², A = k·Rsec, B = k·n·Rpri·(Vs/Vtap)²,
/// whose smaller root is 2(A + B)/(1 - 2B + √(1 - 4B - 4AB)).
/// `None` where it has none (copper so thick in ohms that the rating cannot be reached).
#[must_use]
pub fn regulation_from_resistances(
    tap: Volt,
    winding: Volt,
    windings: u32,
    rating_va: f64,
    primary: Ohm,
    secondary: Ohm,
) -> Option<f64> {
    let n = f64::from(windings);
    if !(primary.0 >= 0.0 && secondary.0 >= 0.0 && n > 0.0 && winding.0 > 0.0 && tap.0 > 0.0) {
        return None;
    }
    let k = rating_va / (n * winding.0 * winding.0);
    let a = k * secondary.0;
    let ratio = winding.0 / tap.0;
    let b = k * n * primary.0 * ratio * ratio;
    let inside = 1.0 - 4.0 * b - 4.0 * a * b;
    if !(inside >= 0.0 && inside.is_finite()) {
        return None;
    }
    let regulation = 2.0 * (a + b) / (1.0 - 2.0 * b + inside.sqrt());
    (regulation > 0.0 && regulation <= 1.0).then_some(regulation)
}

/// (VA, regulation): the middle of what toroid catalogues print for the size. From memory; a seller
/// (MPJA) prints a 20 to 30 % no-load rise below 30 VA.
const ASSUMED_REGULATION: [(f64, f64); 10] = [
    (15.0, 0.25),
    (30.0, 0.18),
    (50.0, 0.14),
    (80.0, 0.12),
    (120.0, 0.095),
    (160.0, 0.09),
    (225.0, 0.08),
    (300.0, 0.065),
    (500.0, 0.05),
    (800.0, 0.04),
];

/// Regulation ρ to ASSUME for a transformer of `rating_va` when none is stated: straight lines in
/// the logarithm of VA through the middle of catalogue ranges (from memory), held at 25 % below
/// 15 VA and at 4 % above 800 VA. A default that must always be listed as assumed.
#[must_use]
pub fn assumed_regulation(rating_va: f64) -> Option<f64> {
    if !(rating_va.is_finite() && rating_va > 0.0) {
        return None;
    }
    let points = ASSUMED_REGULATION.map(|(va, regulation)| (ln(va), regulation));
    straight_lines(&points, ln(rating_va.clamp(15.0, 800.0)))
}

#[cfg(test)]
mod tests {
    use super::*;

    fn case_1_4() -> Transformer {
        Transformer::new(Volt(230.0), Volt(35.0), 2, 300.0, 0.06).unwrap()
    }

    #[test]
    fn resistances_give_back_the_regulation_they_came_from() {
        // Split the copper of a 6 % transformer evenly; by hand: Rs = 0.06·35²/150 = 0.49 ohm, of which
        // half is the winding's own and half is 2·a²·Rpri.
        let t = case_1_4();
        let ratio = t.turns_ratio();
        let primary = Ohm(0.245 / (2.0 * ratio * ratio));
        let back =
            regulation_from_resistances(Volt(230.0), Volt(35.0), 2, 300.0, primary, Ohm(0.245))
                .unwrap();
        assert!((back - 0.06).abs() < 1e-14, "{back}");
        assert!((t.referred(primary, 2).0 - 0.245).abs() < 1e-15);
    }

    #[test]
    fn senseless_plates_are_refused() {
        for bad in [0.0, -1.0, f64::NAN, f64::INFINITY] {
            assert_eq!(
                Transformer::new(Volt(bad), Volt(35.0), 2, 300.0, 0.06),
                None
            );
            assert_eq!(
                Transformer::new(Volt(230.0), Volt(bad), 2, 300.0, 0.06),
                None
            );
            assert_eq!(
                Transformer::new(Volt(230.0), Volt(35.0), 2, bad, 0.06),
                None
            );
            assert_eq!(
                Transformer::new(Volt(230.0), Volt(35.0), 2, 300.0, bad),
                None
            );
            assert_eq!(assumed_regulation(bad), None);
            assert_eq!(regulation_of_full_load(bad), None);
        }
        assert_eq!(
            Transformer::new(Volt(230.0), Volt(35.0), 0, 300.0, 0.06),
            None
        );
        let none =
            regulation_from_resistances(Volt(230.0), Volt(35.0), 2, 300.0, Ohm(1e6), Ohm(0.2));
        assert_eq!(none, None);
    }

    #[test]
    fn assumed_regulation_falls_with_size_and_is_held_outside() {
        let of = |va| assumed_regulation(va).unwrap();
        assert!((of(1.0) - 0.25).abs() < 1e-12 && (of(5000.0) - 0.04).abs() < 1e-12);
        // Half way in the logarithm between 300 and 500 VA: mean of 6.5 and 5 %.
        assert!((of((300.0_f64 * 500.0).sqrt()) - 0.0575).abs() < 1e-12);
        let mut last = 1.0;
        for va in 1..1500 {
            let now = of(f64::from(va));
            assert!(now <= last);
            last = now;
        }
    }
}
