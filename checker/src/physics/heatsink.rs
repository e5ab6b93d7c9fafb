//! Heatsinks: temperature rise against watts, from a stated figure or from the shape.
//! Must not know what is mounted on the sink or how hot it may become.

use super::math;
use super::unit::{Celsius, Kelvin, KelvinPerWatt, Watt};

/// A sink in still air, however it was described.
#[derive(Clone, Copy, Debug, PartialEq)]
pub enum Sink {
    /// By a thermal resistance at a rise.
    Stated(StatedSink),
    /// By its dimensions.
    Finned(FinnedSink),
}

impl Sink {
    /// Mean rise of the sink above the air round it when it gives off `watts`.
    ///
    /// `None` if the watts are negative or not finite, or the answer is past 10 000 K.
    #[must_use]
    pub fn rise(&self, watts: Watt, air: Celsius) -> Option<Kelvin> {
        match self {
            Self::Stated(sink) => sink.rise(watts),
            Self::Finned(sink) => sink.rise(watts, air),
        }
    }

    /// Watts given off at a rise above the air; the inverse of [`Sink::rise`].
    #[must_use]
    pub fn watts(&self, rise: Kelvin, air: Celsius) -> Option<Watt> {
        match self {
            Self::Stated(sink) => sink.watts(rise),
            Self::Finned(sink) => sink.watts(rise, air),
        }
    }

    /// Thermal resistance, rise over watts, at a rise. `None` at a rise of zero, where a sink in
    /// natural convection has none.
    #[must_use]
    pub fn resistance(&self, rise: Kelvin, air: Celsius) -> Option<KelvinPerWatt> {
        let watts = self.watts(rise, air)?;
        (watts.0 > 0.0).then(|| rise / watts)
    }
}

/// A sink known by one catalogue figure.
///
/// `R = R0·(ΔT/ΔT0)^-1/4`: natural convection from a surface, where the film coefficient grows with
/// the fourth root of the rise. Source: the correction table of a maker's catalogue, which is
/// `(75 K/ΔT)^1/4` to three digits from 30 K to 75 K; wider channels follow the same power, narrow
/// ones a higher one, so that below ΔT0 a narrow-channel sink is a little worse than this.
#[derive(Clone, Copy, Debug, PartialEq)]
pub struct StatedSink {
    resistance: KelvinPerWatt,
    at_rise: Kelvin,
}

impl StatedSink {
    /// `resistance` as stated, at the rise for which it is stated. `None` unless both are positive.
    #[must_use]
    pub fn new(resistance: KelvinPerWatt, at_rise: Kelvin) -> Option<Self> {
        let positive = |x: f64| x.is_finite() && x > 0.0;
        (positive(resistance.0) && positive(at_rise.0)).then_some(Self {
            resistance,
            at_rise,
        })
    }

    /// `ΔT = (P·R0·ΔT0^1/4)^4/5`, the law solved for the rise, written as
    /// `ΔT0·(P·R0/ΔT0)^4/5` so that no power of a kelvin stands alone.
    fn rise(&self, watts: Watt) -> Option<Kelvin> {
        if !(watts.is_finite() && watts.0 >= 0.0) {
            return None;
        }
        let straight = watts * self.resistance / self.at_rise;
        let rise = self.at_rise * math::pow(straight, 0.8);
        rise.is_finite().then_some(rise)
    }

    /// `P = (ΔT0/R0)·(ΔT/ΔT0)^5/4`.
    fn watts(&self, rise: Kelvin) -> Option<Watt> {
        if !(rise.is_finite() && rise.0 >= 0.0) {
            return None;
        }
        let relative = rise / self.at_rise;
        let watts = self.at_rise / self.resistance * relative * relative.sqrt().sqrt();
        watts.is_finite().then_some(watts)
    }
}

/// Which way the fins run.
#[derive(Clone, Copy, Debug, PartialEq, Eq)]
pub enum Orientation {
    /// Fins upright: air rises along the channels.
    Vertical,
    /// Fins lying: air crosses them; the thermal resistance is 20 % higher.
    Horizontal,
}

/// Dimensions of a plate with parallel fins, in metres.
#[derive(Clone, Copy, Debug, PartialEq)]
pub struct Geometry {
    /// Width of the plate, across the fins.
    pub width_m: f64,
    /// Length of the plate and of the channels, along the fins.
    pub length_m: f64,
    /// Thickness of the plate.
    pub plate_m: f64,
    /// Number of fins; none is a bare plate.
    pub fins: u32,
    /// How far the fins stand off the plate.
    pub fin_height_m: f64,
    /// Thickness of a fin.
    pub fin_m: f64,
    /// Clear gap between fins.
    pub gap_m: f64,
    /// How it is mounted.
    pub orientation: Orientation,
    /// Whether the face without fins is open to the same air. A face that carries the devices
    /// inside a case is not.
    pub back_open: bool,
}

/// What the sink is made of.
#[derive(Clone, Copy, Debug, PartialEq)]
pub struct Material {
    /// Emissivity of the surface: black anodised aluminium about 0.85, bare about 0.09 (from memory).
    pub emissivity: f64,
    /// Conductivity in W/(m·K): extrusion alloy about 200 (from memory).
    pub conductivity_w_per_mk: f64,
}

/// Why dimensions do not make a sink.
#[derive(Clone, Copy, Debug, PartialEq, Eq)]
pub enum GeometryFault {
    /// A dimension, the emissivity or the conductivity is zero, negative, not finite or above one.
    NotPositive,
    /// Fins and gaps together are wider than the plate.
    WiderThanPlate,
}

/// A plate with fins in natural convection and radiation.
///
/// Heat leaves by three ways: the channels between fins (parallel-plate convection), every other
/// face (convection of a single upright plate), and radiation, for which a channel is a cavity.
/// Shapes within: length up to about 0.5 m (laminar), surroundings at the temperature of the air,
/// nothing near the open faces. Expect ±20 % of a measured sink.
#[derive(Clone, Copy, Debug, PartialEq)]
pub struct FinnedSink {
    geometry: Geometry,
    material: Material,
    /// Walls of one fin side of all channels together, m².
    channel_walls_m2: f64,
    /// Floors of the channels, m².
    channel_floors_m2: f64,
    /// Every other face, m².
    solid_m2: f64,
    /// Openings of the channels, at the front and at both ends, times their apparent emissivity, m².
    openings_m2: f64,
}

impl FinnedSink {
    /// The sink of these dimensions.
    ///
    /// # Errors
    /// If the dimensions contradict themselves, see [`GeometryFault`].
    pub fn new(geometry: Geometry, material: Material) -> Result<Self, GeometryFault> {
        let g = geometry;
        let plate = [g.width_m, g.length_m, g.plate_m];
        let fin = [g.fin_height_m, g.fin_m, g.gap_m];
        let positive = |x: &f64| x.is_finite() && *x > 0.0;
        let finned = g.fins > 0;
        if !plate.iter().all(positive)
            || (finned && !fin.iter().all(positive))
            || !positive(&material.conductivity_w_per_mk)
            || !(material.emissivity > 0.0 && material.emissivity <= 1.0)
        {
            return Err(GeometryFault::NotPositive);
        }
        let (fins, channels) = (f64::from(g.fins), f64::from(g.fins.saturating_sub(1)));
        let (covered, height, thick, gap) = if finned {
            let covered = fins * g.fin_m + channels * g.gap_m;
            (covered, g.fin_height_m, g.fin_m, g.gap_m)
        } else {
            (0.0, 0.0, 0.0, 0.0)
        };
        // A hair more than the plate is rounding of the stated millimetres.
        if covered > g.width_m * 1.001 {
            return Err(GeometryFault::WiderThanPlate);
        }
        let beside_fins = (g.width_m - covered).max(0.0) * g.length_m;
        let fin_edges = fins * thick * (g.length_m + 2.0 * height);
        let outer_sides = if finned {
            2.0 * height * g.length_m
        } else {
            0.0
        };
        let plate_edges = 2.0 * g.plate_m * (g.width_m + g.length_m);
        let back = if g.back_open {
            g.width_m * g.length_m
        } else {
            0.0
        };
        let opening = channels * gap * (g.length_m + 2.0 * height);
        let cavity = if channels > 0.0 {
            apparent_emissivity(gap, height, material.emissivity)
        } else {
            0.0
        };
        Ok(Self {
            geometry,
            material,
            channel_walls_m2: channels * height * g.length_m,
            channel_floors_m2: channels * gap * g.length_m,
            solid_m2: beside_fins + fin_edges + outer_sides + plate_edges + back,
            openings_m2: opening * cavity,
        })
    }

    fn watts(&self, rise: Kelvin, air: Celsius) -> Option<Watt> {
        if !(rise.is_finite() && rise.0 >= 0.0) {
            return None;
        }
        let film = Air::at(air + rise * 0.5)?;
        let length = self.geometry.length_m;
        let single = film.plate_coefficient(rise, length);
        let mut convection = single * self.solid_m2;
        if self.channel_walls_m2 > 0.0 {
            let channel = film.channel_coefficient(rise, self.geometry.gap_m, length);
            let walls = 2.0 * self.channel_walls_m2 * self.fin_efficiency(channel);
            convection += channel * (walls + self.channel_floors_m2);
        }
        let radiating = self.openings_m2 + self.material.emissivity * self.solid_m2;
        let radiation = radiation_coefficient(air + rise, air)? * radiating;
        let upright = (convection + radiation) * rise.0;
        let watts = Watt(match self.geometry.orientation {
            Orientation::Vertical => upright,
            Orientation::Horizontal => upright / HORIZONTAL_PENALTY,
        });
        watts.is_finite().then_some(watts)
    }

    /// The watts rise without a turn with the rise, so one bracket holds the only answer.
    fn rise(&self, watts: Watt, air: Celsius) -> Option<Kelvin> {
        if !(watts.is_finite() && watts.0 >= 0.0) {
            return None;
        }
        let mut top = 64.0;
        while self.watts(Kelvin(top), air)?.0 < watts.0 {
            top *= 2.0;
            if top > HOTTEST_RISE_K {
                return None;
            }
        }
        let excess = |rise: f64| {
            self.watts(Kelvin(rise), air)
                .map_or(f64::NAN, |given_off| given_off.0 - watts.0)
        };
        math::root(excess, 0.0, top, 1e-10).map(Kelvin)
    }

    /// Efficiency of a straight fin of uniform thickness with an idle tip: `tanh(mH)/(mH)`,
    /// `m = √(2h/(k·t))`. Textbook (from memory).
    fn fin_efficiency(&self, coefficient: f64) -> f64 {
        let g = self.geometry;
        let m = (2.0 * coefficient / (self.material.conductivity_w_per_mk * g.fin_m)).sqrt();
        let x = m * g.fin_height_m;
        if x < 1e-6 {
            return 1.0; // 1 - x²/3, and 0/0 at x = 0
        }
        let decay = math::exp(-2.0 * x);
        -math::expm1(-2.0 * x) / ((1.0 + decay) * x)
    }
}

/// Rsa of a sink with fins lying against fins upright: about +20 %, a maker's catalogue.
const HORIZONTAL_PENALTY: f64 = 1.2;

/// Where the search for a rise gives up.
const HOTTEST_RISE_K: f64 = 10_000.0;

/// Acceleration of free fall, m/s².
const GRAVITY: f64 = 9.81;

/// Stefan-Boltzmann constant, W/(m²·K⁴), CODATA 2018.
const STEFAN_BOLTZMANN: f64 = 5.670_374_419e-8;

/// Zero of the Celsius scale in kelvins.
const ZERO_CELSIUS_K: f64 = 273.15;

/// Properties of air that set natural convection.
#[derive(Clone, Copy, Debug, PartialEq)]
pub struct Air {
    /// Conductivity k, W/(m·K).
    pub conductivity_w_per_mk: f64,
    /// Kinematic viscosity ν, m²/s.
    pub viscosity_m2_per_s: f64,
    /// Prandtl number.
    pub prandtl: f64,
    /// Expansion coefficient β, 1/K.
    pub expansion_per_k: f64,
}

impl Air {
    /// Dry air at 101 325 Pa and the film temperature, the mean of surface and air.
    ///
    /// Sutherland's law for the viscosity, the conductivity formula beside it, the ideal-gas law
    /// and cp = 1006 J/(kg·K): US Standard Atmosphere 1976 (from memory). Within 3 % of textbook
    /// tables from -50 to 250 °C. `None` at or below absolute zero.
    #[must_use]
    pub fn at(film: Celsius) -> Option<Self> {
        const PRESSURE: f64 = 101_325.0;
        const GAS_CONSTANT: f64 = 287.05;
        const HEAT_CAPACITY: f64 = 1006.0;
        let t = film.0 + ZERO_CELSIUS_K;
        if !(t.is_finite() && t > 0.0) {
            return None;
        }
        let t_15 = t * t.sqrt();
        let viscosity = 1.458e-6 * t_15 / (t + 110.4);
        let conductivity = 2.646_38e-3 * t_15 / (t + 245.4 * math::pow(10.0, -12.0 / t));
        let density = PRESSURE / (GAS_CONSTANT * t);
        Some(Self {
            conductivity_w_per_mk: conductivity,
            viscosity_m2_per_s: viscosity / density,
            prandtl: viscosity * HEAT_CAPACITY / conductivity,
            expansion_per_k: 1.0 / t,
        })
    }

    /// Rayleigh number `g·β·ΔT·x³·Pr/ν²` of a length in metres.
    #[must_use]
    pub fn rayleigh(&self, rise: Kelvin, x_m: f64) -> f64 {
        let nu = self.viscosity_m2_per_s;
        GRAVITY * self.expansion_per_k * rise.0 * x_m * x_m * x_m * self.prandtl / (nu * nu)
    }

    /// Film coefficient in W/(m²·K) of a single upright plate of a length in metres:
    /// `h = (k/L)·0.59·Ra^1/4`, laminar, Ra up to about 1e9. W. H. McAdams, Heat Transmission
    /// (from memory).
    #[must_use]
    pub fn plate_coefficient(&self, rise: Kelvin, length_m: f64) -> f64 {
        let ra = self.rayleigh(rise, length_m);
        self.conductivity_w_per_mk / length_m * 0.59 * ra.sqrt().sqrt()
    }

    /// Film coefficient in W/(m²·K) between upright plates a gap S apart and of length L, both
    /// at one temperature: `h = (k/S)·Nu(Ra(S)·S/L)`, see [`channel_nusselt`].
    #[must_use]
    pub fn channel_coefficient(&self, rise: Kelvin, gap_m: f64, length_m: f64) -> f64 {
        let elenbaas = self.rayleigh(rise, gap_m) * gap_m / length_m;
        self.conductivity_w_per_mk / gap_m * channel_nusselt(elenbaas)
    }
}

/// Nusselt number of natural convection between isothermal parallel plates,
/// `Nu = [576/El² + 2.873/El^1/2]^-1/2`, `El = Ra(S)·S/L`.
///
/// It joins fully developed flow (`El/24`, narrow) to two single plates (`0.59·El^1/4`, wide).
/// Source: A. Bar-Cohen and W. M. Rohsenow, J. Heat Transfer 106 (1984) 116-123, as restated in
/// Çengel and Ghajar, Heat and Mass Transfer. Zero flow (El = 0) gives zero; written as
/// `El/√(576 + 2.873·El^3/2)`, which does not divide by El.
#[must_use]
pub fn channel_nusselt(elenbaas: f64) -> f64 {
    elenbaas / (576.0 + 2.873 * elenbaas * elenbaas.sqrt()).sqrt()
}

/// Emissivity that a channel seems to have at its opening:
/// `1/(1 + (S/(S + 2H))·(1/ε - 1))`, gap S, depth H, wall emissivity ε.
///
/// The grey, diffuse cavity formula (from memory): walls in parallel see each other and leave only
/// through the opening, so a deep channel looks black and radiates from its opening alone.
#[must_use]
pub fn apparent_emissivity(gap_m: f64, depth_m: f64, emissivity: f64) -> f64 {
    1.0 / (1.0 + gap_m / (gap_m + 2.0 * depth_m) * (1.0 / emissivity - 1.0))
}

/// Film coefficient of black-body radiation, `σ(T1² + T2²)(T1 + T2)`, in W/(m²·K): the difference
/// of fourth powers divided by that of the temperatures, without the cancellation.
///
/// `None` below absolute zero.
#[must_use]
pub fn radiation_coefficient(surface: Celsius, surroundings: Celsius) -> Option<f64> {
    let (a, b) = (surface.0 + ZERO_CELSIUS_K, surroundings.0 + ZERO_CELSIUS_K);
    let h = STEFAN_BOLTZMANN * (a * a + b * b) * (a + b);
    (a >= 0.0 && b >= 0.0 && h.is_finite()).then_some(h)
}

#[cfg(test)]
mod tests {
    use super::*;
    use proptest::prelude::*;

    fn plate_with_fins() -> Geometry {
        Geometry {
            width_m: 0.3,
            length_m: 0.1,
            plate_m: 0.01,
            fins: 25,
            fin_height_m: 0.04,
            fin_m: 0.002,
            gap_m: 0.01,
            orientation: Orientation::Vertical,
            back_open: false,
        }
    }

    const BLACK: Material = Material {
        emissivity: 0.85,
        conductivity_w_per_mk: 200.0,
    };

    proptest! {
        #[test]
        fn stated_rise_and_watts_are_inverse(r in 0.02..50.0_f64, at in 5.0..100.0_f64, p in 0.0..1e3_f64) {
            let sink = Sink::Stated(StatedSink::new(KelvinPerWatt(r), Kelvin(at)).unwrap());
            let rise = sink.rise(Watt(p), Celsius(25.0)).unwrap();
            prop_assert!((sink.watts(rise, Celsius(25.0)).unwrap().0 - p).abs() <= 1e-12 * (1.0 + p));
            // Brute-force twin: the law as stated, R0·(ΔT/ΔT0)^-1/4, iterated to its fixed point.
            let mut t = at;
            for _ in 0..200 {
                t = 0.5 * (t + p * r * libm::pow(t / at, -0.25));
            }
            prop_assert!((rise.0 - t).abs() <= 1e-9 * (1.0 + t), "{} {t}", rise.0);
        }

        #[test]
        fn finned_rise_and_watts_are_inverse_and_rise_together(
            p in 0.01..500.0_f64, air in -20.0..60.0_f64, gap in 0.002..0.03_f64, h in 0.005..0.1_f64,
        ) {
            let shape = Geometry { gap_m: gap, fin_height_m: h, width_m: 1.0, ..plate_with_fins() };
            let sink = Sink::Finned(FinnedSink::new(shape, BLACK).unwrap());
            let rise = sink.rise(Watt(p), Celsius(air)).unwrap();
            let back = sink.watts(rise, Celsius(air)).unwrap();
            prop_assert!((back.0 - p).abs() < 1e-8 * (1.0 + p));
            let hotter = sink.watts(rise + Kelvin(1.0), Celsius(air)).unwrap();
            prop_assert!(hotter.0 > back.0);
        }

        #[test]
        fn no_number_from_nonsense(r in proptest::num::f64::ANY, at in proptest::num::f64::ANY, p in proptest::num::f64::ANY, air in proptest::num::f64::ANY,
            w in proptest::num::f64::ANY, n in any::<u32>()) {
            if let Some(sink) = StatedSink::new(KelvinPerWatt(r), Kelvin(at)) {
                prop_assert!(sink.rise(Watt(p)).is_none_or(Kelvin::is_finite));
                prop_assert!(sink.watts(Kelvin(p)).is_none_or(Watt::is_finite));
            }
            let shape = Geometry { width_m: w, fins: n, ..plate_with_fins() };
            if let Ok(sink) = FinnedSink::new(shape, BLACK) {
                prop_assert!(sink.rise(Watt(p), Celsius(air)).is_none_or(Kelvin::is_finite));
                prop_assert!(sink.watts(Kelvin(p), Celsius(air)).is_none_or(Watt::is_finite));
            }
        }
    }

    #[test]
    fn contradictory_dimensions_are_told_apart() {
        let wide = Geometry {
            fins: 40,
            ..plate_with_fins()
        };
        assert_eq!(
            FinnedSink::new(wide, BLACK),
            Err(GeometryFault::WiderThanPlate)
        );
        let flat = Geometry {
            gap_m: 0.0,
            ..plate_with_fins()
        };
        assert_eq!(
            FinnedSink::new(flat, BLACK),
            Err(GeometryFault::NotPositive)
        );
        let mirror = Material {
            emissivity: 1.5,
            ..BLACK
        };
        assert_eq!(
            FinnedSink::new(plate_with_fins(), mirror),
            Err(GeometryFault::NotPositive)
        );
    }

    #[test]
    fn lying_fins_are_a_fifth_worse() {
        let at = |orientation| {
            let shape = Geometry {
                orientation,
                ..plate_with_fins()
            };
            let sink = Sink::Finned(FinnedSink::new(shape, BLACK).unwrap());
            sink.resistance(Kelvin(50.0), Celsius(25.0)).unwrap().0
        };
        let ratio = at(Orientation::Horizontal) / at(Orientation::Vertical);
        assert!((ratio - 1.2).abs() < 1e-12);
    }

    #[test]
    fn a_bare_plate_is_its_two_faces_and_edges() {
        // 0.1 m x 0.1 m x 2 mm, both faces open, 50 K above 25 °C: area 0.0208 m²,
        // h = 0.59 (k/L) Ra^1/4 + ε·h_r with the film at 50 °C, worked from the parts.
        let shape = Geometry {
            width_m: 0.1,
            length_m: 0.1,
            plate_m: 0.002,
            fins: 0,
            back_open: true,
            ..plate_with_fins()
        };
        let sink = FinnedSink::new(shape, BLACK).unwrap();
        let h = Air::at(Celsius(50.0))
            .unwrap()
            .plate_coefficient(Kelvin(50.0), 0.1)
            + 0.85 * radiation_coefficient(Celsius(75.0), Celsius(25.0)).unwrap();
        let want = h * 0.0208 * 50.0;
        assert!((sink.watts(Kelvin(50.0), Celsius(25.0)).unwrap().0 - want).abs() < 1e-9);
    }

    #[test]
    fn long_fins_are_less_efficient() {
        // tanh(x)/x by hand: h 8 W/(m²K), k 200, t 2 mm: m = √40 = 6.3246 1/m; H 0.04 m:
        // x = 0.25298, tanh x = 0.24772, ratio 0.9792.
        let sink = FinnedSink::new(plate_with_fins(), BLACK).unwrap();
        assert!((sink.fin_efficiency(8.0) - 0.9792).abs() < 1e-4);
        assert!((sink.fin_efficiency(0.0) - 1.0).abs() < 1e-15);
    }
}
