//! What the blocks of one build say, typed: devices, stages, loads, supply, and the build itself.
//! Must not know physics. A default that the vocabulary names is used here, and only here, and is
//! listed as assumed.

use std::cell::RefCell;
use std::collections::HashMap;
use std::rc::Rc;

use super::lower::lower;
use super::statement::{Bought, Group, Select, Slot, Value, bounds};
use super::view::{Seen, View};
use crate::finding::{Assumed, FileId, Measure, Site};
use crate::physics::unit::{
    Amp, AmpSquaredSecond, Celsius, Farad, Henry, Hertz, Joule, Kelvin, KelvinPerWatt, Ohm, Second,
    Volt, VoltPerKelvin, Watt,
};
use crate::quantity::Form;

/// A missing key, and the block that lacks it.
#[derive(Clone, Debug, PartialEq, Eq, PartialOrd, Ord)]
pub struct Need {
    /// `device n16 junction-case`.
    pub key: String,
    /// The block that lacks it.
    pub site: Site,
}

/// Why a number could not be had: keys that are missing, or data that end too soon.
#[derive(Clone, Debug, Default, PartialEq, Eq)]
pub struct Needs {
    /// The missing keys.
    pub keys: Vec<Need>,
    /// Why else, in words.
    pub because: String,
}

impl Needs {
    /// Not for want of a key.
    #[must_use]
    pub fn because(why: impl Into<String>) -> Self {
        Self {
            keys: Vec::new(),
            because: why.into(),
        }
    }
    /// Both reasons.
    #[must_use]
    pub fn and(mut self, other: Self) -> Self {
        for key in other.keys {
            if !self.keys.contains(&key) {
                self.keys.push(key);
            }
        }
        if self.because.is_empty() {
            self.because = other.because;
        }
        self
    }
}

/// Two answers, or everything that both lack.
///
/// # Errors
/// When either is an error.
pub fn both<A, B>(a: Result<A, Needs>, b: Result<B, Needs>) -> Result<(A, B), Needs> {
    match (a, b) {
        (Ok(a), Ok(b)) => Ok((a, b)),
        (Err(a), Err(b)) => Err(a.and(b)),
        (Err(e), _) | (_, Err(e)) => Err(e),
    }
}

/// Three answers, or everything that they lack.
///
/// # Errors
/// When any is an error.
pub fn three<A, B, C>(
    a: Result<A, Needs>,
    b: Result<B, Needs>,
    c: Result<C, Needs>,
) -> Result<(A, B, C), Needs> {
    let ((a, b), c) = both(both(a, b), c)?;
    Ok((a, b, c))
}

/// Who a field belongs to.
#[derive(Clone, Debug, PartialEq, Eq)]
pub struct Owner {
    /// `device`.
    pub kind: &'static str,
    /// `n16`.
    pub name: String,
    /// Its header.
    pub site: Site,
}

/// What a key of one block says.
#[derive(Clone, Debug)]
pub struct Field<T> {
    value: Option<T>,
    line: Option<Site>,
    /// `none` was written: known not fitted.
    pub none: bool,
    /// The value is a default, not stated.
    pub assumed: bool,
    owner: Rc<Owner>,
    key: &'static str,
}

impl<T> Field<T> {
    /// The value, or the name of the missing key.
    ///
    /// # Errors
    /// When it is neither stated nor has a default.
    pub fn need(&self) -> Result<&T, Needs> {
        self.value.as_ref().ok_or_else(|| self.missing())
    }
    /// The value, if there is one.
    #[must_use]
    pub fn get(&self) -> Option<&T> {
        self.value.as_ref()
    }
    /// Put another value in place of what is stated.
    pub fn set(&mut self, value: T) {
        self.value = Some(value);
        self.assumed = false;
    }
    /// That this key is missing.
    #[must_use]
    pub fn missing(&self) -> Needs {
        self.missing_part("")
    }
    /// That a part of this key is missing (`esr`).
    #[must_use]
    pub fn missing_part(&self, part: &str) -> Needs {
        let space = if part.is_empty() { "" } else { " " };
        let key = format!(
            "{} {} {}{space}{part}",
            self.owner.kind, self.owner.name, self.key
        );
        Needs {
            keys: vec![Need {
                key,
                site: self.line.unwrap_or(self.owner.site),
            }],
            because: String::new(),
        }
    }
    /// A part of the value, or the name of the missing part.
    ///
    /// # Errors
    /// When the key or the part is missing.
    pub fn part<U>(&self, name: &str, get: impl FnOnce(&T) -> Option<U>) -> Result<U, Needs> {
        get(self.need()?).ok_or_else(|| self.missing_part(name))
    }
    /// Neither stated nor `none` nor defaulted.
    #[must_use]
    pub fn unstated(&self) -> bool {
        self.value.is_none() && !self.none
    }
    /// The line that states it, else the header of the block.
    #[must_use]
    pub fn site(&self) -> Site {
        self.line.unwrap_or(self.owner.site)
    }
    /// The line that states it.
    #[must_use]
    pub fn stated_at(&self) -> Option<Site> {
        self.line
    }
    /// The block it belongs to.
    #[must_use]
    pub fn owner(&self) -> &Owner {
        &self.owner
    }
    /// The key's name.
    #[must_use]
    pub fn key(&self) -> &'static str {
        self.key
    }
}

/// A toleranced value: nominal and both ends.
#[derive(Clone, Copy, Debug, PartialEq)]
pub struct Spread<T> {
    /// As stated.
    pub nominal: T,
    /// Least.
    pub low: T,
    /// Greatest.
    pub high: T,
}

/// A quantity of the SI unit of a newtype.
pub trait FromSi: Copy {
    /// From the SI value.
    fn from_si(value: f64) -> Self;
}

macro_rules! from_si { ($($t:ident),*) => { $(impl FromSi for $t { fn from_si(value: f64) -> Self { Self(value) } })* }; }
from_si!(
    Amp,
    AmpSquaredSecond,
    Celsius,
    Farad,
    Henry,
    Hertz,
    Joule,
    Kelvin,
    KelvinPerWatt,
    Ohm,
    Second,
    Volt,
    VoltPerKelvin,
    Watt
);
impl FromSi for f64 {
    fn from_si(value: f64) -> Self {
        value
    }
}

fn get<T: FromSi>(group: &Group, slot: &str) -> Option<T> {
    group.number(slot).map(T::from_si)
}

fn spread<T: FromSi>(group: &Group, slot: &str) -> Option<Spread<T>> {
    let q = group.quantity(slot)?;
    let (low, high) = bounds(q);
    Some(Spread {
        nominal: T::from_si(q.value),
        low: T::from_si(low),
        high: T::from_si(high),
    })
}

/// Reads the blocks of one view, and keeps what was assumed on the way.
#[derive(Debug)]
pub struct Reader<'v, 'a> {
    view: &'v View<'a>,
    assumed: RefCell<Vec<Assumed>>,
}

/// A block being read.
struct Page<'r, 'v, 'a> {
    reader: &'r Reader<'v, 'a>,
    seen: Rc<Seen<'a>>,
    owner: Rc<Owner>,
}

impl Page<'_, '_, '_> {
    fn field<T>(&self, key: &'static str, read: impl Fn(&[Group]) -> Option<T>) -> Field<T> {
        let line = self.seen.line(key);
        Field {
            value: line.filter(|l| !l.none).and_then(|l| read(&l.groups)),
            line: line.map(|l| l.site),
            none: line.is_some_and(|l| l.none),
            assumed: false,
            owner: self.owner.clone(),
            key,
        }
    }
    fn one<T>(&self, key: &'static str, read: impl Fn(&Group) -> Option<T>) -> Field<T> {
        self.field(key, |groups| read(groups.first()?))
    }
    fn si<T: FromSi>(&self, key: &'static str, slot: &'static str) -> Field<T> {
        self.one(key, |g| get(g, slot))
    }
    fn word(&self, key: &'static str, slot: &'static str) -> Field<&'static str> {
        self.one(key, |g| g.word(slot))
    }
    fn points<A: FromSi, B: FromSi>(
        &self,
        key: &'static str,
        a: &'static str,
        b: &'static str,
    ) -> Field<Vec<(A, B)>> {
        self.field(key, |groups| {
            groups
                .iter()
                .map(|g| Some((get(g, a)?, get(g, b)?)))
                .collect()
        })
    }
    /// A default: used where the key is left out, and listed.
    fn or<T>(
        &self,
        mut field: Field<T>,
        default: T,
        shown: Measure,
        why: &'static str,
    ) -> Field<T> {
        if field.unstated() {
            field.value = Some(default);
            field.assumed = true;
            self.assume(field.key, shown, why);
        }
        field
    }
    fn assume(&self, key: &str, value: impl Into<Option<Measure>>, why: &'static str) {
        let key = format!("{} {} {key}", self.owner.kind, self.owner.name);
        let mut all = self.reader.assumed.borrow_mut();
        if !all.iter().any(|a| a.key == key) {
            all.push(Assumed {
                key,
                value: value.into(),
                why,
                site: self.owner.site,
            });
        }
    }
}

/// Kind and polarity of a device.
#[derive(Clone, Copy, Debug, PartialEq, Eq)]
pub enum Flavour {
    /// A bipolar transistor, `npn`, `pnp` or a pair stated once.
    Bipolar,
    /// A MOSFET.
    Mosfet,
}

/// One safe-area line.
#[derive(Clone, Debug)]
pub struct SoaLine {
    /// The pulse length; `None` is the d.c. curve.
    pub pulse: Option<Second>,
    /// The points as stated.
    pub points: Vec<(Volt, Amp)>,
    /// The line.
    pub site: Site,
}

/// One gain line.
#[derive(Clone, Debug)]
pub struct GainLine {
    /// `minimum`, else `typical`.
    pub minimum: bool,
    /// Gain at collector current.
    pub points: Vec<(Amp, f64)>,
    /// The line.
    pub site: Site,
}

/// A device.
#[derive(Clone, Debug)]
pub struct Device {
    /// Name and header.
    pub owner: Rc<Owner>,
    /// Bipolar or MOSFET.
    pub flavour: Flavour,
    /// `npn`, `complementary`; `None` where the header does not say.
    pub kind: Option<&'static str>,
    /// V(BR)CEO or V(BR)DSS.
    pub breakdown: Field<Volt>,
    /// VGS limit.
    pub gate_limit: Field<Volt>,
    /// `lateral` or `vertical`.
    pub structure: Field<&'static str>,
    /// VGS against ID.
    pub gate_source: Field<Vec<(Volt, Amp)>>,
    /// dVGS/dT against ID.
    pub gate_drift: Field<Vec<(VoltPerKelvin, Amp)>>,
    /// RDS(on) at 25 degC.
    pub on_resistance: Field<Ohm>,
    /// Stated second-breakdown derating, per K.
    pub second_breakdown: Field<f64>,
    /// IC or ID.
    pub current: Field<Amp>,
    /// ICM or IDM.
    pub peak_current: Field<Amp>,
    /// IB limit.
    pub base: Field<Amp>,
    /// Ptot and the case temperature it holds at.
    pub power: Field<(Watt, Celsius)>,
    /// Tj,max.
    pub junction: Field<Celsius>,
    /// Rth(j-c), from power where not stated.
    pub junction_case: Field<KelvinPerWatt>,
    /// Foster terms.
    pub foster: Field<Vec<(KelvinPerWatt, Second)>>,
    /// Safe-area lines, d.c. first, then longest pulse first.
    pub soa: Vec<SoaLine>,
    /// The `soa dc` line as a field, for naming it when it is missing.
    pub soa_dc: Field<()>,
    /// Gain lines.
    pub hfe: Vec<GainLine>,
    /// Whether any gain is stated, as a field for naming it when it is missing.
    pub hfe_field: Field<()>,
    /// VBE, and the current it holds at.
    pub vbe: Field<(Volt, Option<Amp>)>,
    /// fT.
    pub transition: Field<(Hertz, Option<Amp>)>,
    /// Order codes: upper then lower.
    pub codes: Vec<String>,
    /// Where bought.
    pub source: Field<&'static str>,
}

/// A resistor of each device.
#[derive(Clone, Copy, Debug)]
pub struct Resistor {
    /// Its resistance.
    pub ohm: Spread<Ohm>,
    /// Its rating at 70 degC.
    pub watt: Option<Watt>,
    /// Its pulse current.
    pub pulse: Option<Amp>,
}

/// One group of `idle`.
#[derive(Clone, Copy, Debug, PartialEq)]
pub struct Idle {
    /// Amperes.
    pub current: Option<Amp>,
    /// Volts.
    pub volts: Option<Volt>,
    /// `device`, `channel`.
    pub per: Option<&'static str>,
    /// `emitter`, `both-emitters`.
    pub across: Option<&'static str>,
    /// Where it stands.
    pub site: Site,
}

/// A stage.
#[derive(Clone, Debug)]
pub struct Stage {
    /// Name and header.
    pub owner: Rc<Owner>,
    /// `emitter-follower` and its like.
    pub connection: &'static str,
    /// The upper device.
    pub upper: Rc<Device>,
    /// The lower device; the same one where it is complementary.
    pub lower: Rc<Device>,
    /// The `devices` line.
    pub devices: Field<()>,
    /// What the bill of materials says of the devices.
    pub bought: Bought,
    /// Devices of each polarity.
    pub pairs: Field<u32>,
    /// Emitter resistor.
    pub emitter: Field<Resistor>,
    /// What the bill of materials says of the emitter resistors.
    pub emitter_bought: Option<Bought>,
    /// Base-emitter resistor of the bank.
    pub base_emitter: Field<Resistor>,
    /// Bias as stated.
    pub idle: Field<Vec<Idle>>,
    /// Case to sink.
    pub insulator: Field<KelvinPerWatt>,
    /// A sink of its own: K/W, and per `device` or `stage`.
    pub own_sink: Field<(KelvinPerWatt, &'static str)>,
    /// VBE spread of parallel devices.
    pub vbe_spread: Field<Volt>,
    /// Hottest to coolest device.
    pub spread_across_sink: Field<Kelvin>,
    /// Gate clamp.
    pub gate_zener: Field<Volt>,
    /// Driver supply above the output rail.
    pub driver_rail: Field<Volt>,
    /// Where the bias sensor is mounted, and how much cooler that place is.
    pub sensor: Field<(&'static str, Option<Kelvin>)>,
    /// What a voltage amplifier gives.
    pub output_current: Field<Amp>,
    /// Tail current and compensation.
    pub tail: Field<(Amp, Farad)>,
}

/// A claim of `rated`.
#[derive(Clone, Copy, Debug)]
pub struct Claim {
    /// The power.
    pub power: Watt,
    /// Into this.
    pub load: Ohm,
    /// All channels, else one.
    pub all_channels: bool,
    /// At low mains, else nominal.
    pub low_mains: bool,
    /// Where it stands.
    pub site: Site,
}

/// A bank of capacitors.
#[derive(Clone, Debug)]
pub struct Reservoir {
    /// How many per rail.
    pub count: u32,
    /// Of each.
    pub farad: Spread<Farad>,
    /// Rating.
    pub volt: Volt,
    /// Series resistance of each.
    pub esr: Option<Ohm>,
    /// Ripple rating of each.
    pub ripple: Option<Amp>,
    /// Stated life, and the temperature it holds at.
    pub life: Option<(Second, Celsius)>,
    /// Bill of materials.
    pub bought: Bought,
    /// Where it stands.
    pub site: Site,
}

/// The board.
#[derive(Clone, Debug)]
pub struct Amplifier {
    /// Name and header.
    pub owner: Rc<Owner>,
    /// The output stage.
    pub output: Rc<Stage>,
    /// Its driver.
    pub driver: Option<Rc<Stage>>,
    /// Third follower.
    pub predriver: Option<Rc<Stage>>,
    /// Voltage amplifier.
    pub voltage_amplifier: Option<Rc<Stage>>,
    /// The `driver` line, for naming it when it is missing.
    pub driver_field: Field<()>,
    /// The `voltage-amplifier` line, for naming it when it is missing.
    pub voltage_field: Field<()>,
    /// Claimed powers.
    pub rated: Field<Vec<Claim>>,
    /// Full-power band.
    pub band: Field<(Hertz, Hertz)>,
    /// Drop: volts at current; no current is every current.
    pub drop: Field<Vec<(Volt, Option<Amp>)>>,
    /// Gain, dB.
    pub gain: Field<f64>,
    /// Channels on a board.
    pub channels_per_board: Field<u32>,
    /// Capacitors on each board.
    pub board_reservoir: Field<Reservoir>,
    /// The output network.
    pub network: Option<Network>,
    /// The `network` line.
    pub network_field: Field<()>,
}

/// The output network.
#[derive(Clone, Debug)]
pub struct Network {
    /// Name and header.
    pub owner: Rc<Owner>,
    /// Zobel: R, its watts, C, its volts.
    pub zobel: Field<(Ohm, Watt, Farad, Option<Volt>)>,
    /// Coil: L, damping resistor, its watts.
    pub coil: Field<(Henry, Option<Ohm>, Option<Watt>)>,
}

/// What a load is.
#[derive(Clone, Debug)]
pub enum LoadKind {
    /// A resistor.
    Resistive(Spread<Ohm>),
    /// A loudspeaker known by its rated impedance: nominal, least modulus, angle in degrees.
    Nominal(Ohm, Field<Ohm>, Field<f64>),
    /// A drive unit: Re, Le, exponent of a lossy inductance, resonances (fs, Qms, Qes).
    VoiceCoil(Ohm, Henry, Option<f64>, Vec<(Hertz, f64, f64)>),
    /// A CSV file, by the path as written, and where that stands.
    Table(String, Site),
    /// Several at once.
    Parallel(Vec<Rc<Load>>),
    /// Nothing that says what it is.
    Unstated,
}

/// A load.
#[derive(Clone, Debug)]
pub struct Load {
    /// Name and header.
    pub owner: Rc<Owner>,
    /// What it is.
    pub kind: LoadKind,
    /// The line that says so.
    pub line: Field<()>,
    /// Rated impedance, where stated.
    pub nominal: Field<Ohm>,
    /// D.c. resistance.
    pub dc: Field<Ohm>,
    /// What the coil stands: joules, or watts.
    pub endurance: Field<(Option<Joule>, Option<Watt>)>,
}

/// A heatsink.
#[derive(Clone, Debug)]
pub struct Heatsink {
    /// Name and header.
    pub owner: Rc<Owner>,
    /// K/W, and the rise it holds at.
    pub resistance: Field<(KelvinPerWatt, Kelvin)>,
    /// Mass, kg.
    pub mass: Field<f64>,
    /// `no`, `brushed`, `held`.
    pub touchable: Field<&'static str>,
    /// Plate: width, height, thickness, m.
    pub plate: Field<[f64; 3]>,
    /// Fins: count, length, thickness, gap in m, vertical.
    pub fins: Field<(u32, [f64; 3], bool)>,
}

/// A transformer.
#[derive(Clone, Debug)]
pub struct Transformer {
    /// Name and header.
    pub owner: Rc<Owner>,
    /// Taps.
    pub primary: Field<Vec<Volt>>,
    /// Windings and volts of each.
    pub secondary: Field<(u32, Volt)>,
    /// VA of the whole transformer.
    pub rating: Field<f64>,
    /// The rating was stated per winding.
    pub per_winding: bool,
    /// (no-load - full-load)/full-load.
    pub regulation: Field<f64>,
    /// Winding resistances: primary, each secondary.
    pub resistance: Field<(Ohm, Ohm)>,
    /// Thermal fuse.
    pub thermal_fuse: Field<Celsius>,
}

/// The rectifier.
#[derive(Clone, Copy, Debug)]
pub struct Rectifier {
    /// 1 on a centre tap, 2 one per winding.
    pub bridges: u32,
    /// VRRM.
    pub reverse: Option<Volt>,
    /// Mean current rating.
    pub mean: Option<Amp>,
    /// IFSM.
    pub surge: Option<Amp>,
    /// Drop of one diode.
    pub drop: Volt,
}

/// A fuse.
#[derive(Clone, Debug)]
pub struct FuseLine {
    /// `mains`, `secondary`, `rail`, `speaker`.
    pub place: &'static str,
    /// Rating.
    pub rating: Amp,
    /// Time-lag, else quick.
    pub slow: bool,
    /// Melting I2t.
    pub melts: Option<AmpSquaredSecond>,
    /// For that strap only.
    pub tap: Option<Volt>,
    /// `transformer`, `supply`, `rail`, `channel`.
    pub per: Option<&'static str>,
    /// Where it stands.
    pub site: Site,
}

/// The soft start.
#[derive(Clone, Copy, Debug)]
pub struct SoftStart {
    /// Resistor, or the cold NTC.
    pub cold: Ohm,
    /// The NTC when hot; `None` for a resistor.
    pub hot: Option<Ohm>,
    /// Rating of the resistor.
    pub watt: Option<Watt>,
    /// When it is bypassed.
    pub bypass: Option<Second>,
    /// What the NTC stands.
    pub energy: Option<Joule>,
    /// Thermal fuse on it.
    pub thermal_fuse: Option<Celsius>,
}

/// A supply.
#[derive(Clone, Debug)]
pub struct Supply {
    /// Name and header.
    pub owner: Rc<Owner>,
    /// How many transformers.
    pub transformers: u32,
    /// The transformer.
    pub transformer: Rc<Transformer>,
    /// The `transformer` line.
    pub transformer_field: Field<()>,
    /// The rectifier.
    pub rectifier: Field<Rectifier>,
    /// The reservoir, one entry per kind of capacitor.
    pub reservoir: Field<Vec<Reservoir>>,
    /// Bleeder, and whether it stands rail to rail.
    pub bleeder: Field<(Resistor, bool)>,
    /// Fuses, all places.
    pub fuses: Vec<FuseLine>,
    /// `fuse mains`, for naming it when it is missing.
    pub mains_fuse: Field<()>,
    /// `fuse rail`.
    pub rail_fuse: Field<()>,
    /// Soft start.
    pub soft_start: Field<SoftStart>,
    /// Secondary leads, each.
    pub wiring: Field<Ohm>,
    /// Charged terminals can be touched.
    pub touchable: bool,
}

/// The limit line of the protection.
#[derive(Clone, Debug)]
pub struct LimitLine {
    /// Of the bank, else of each device.
    pub bank: bool,
    /// The points.
    pub points: Vec<(Volt, Amp)>,
}

/// The V-I limiter of one device.
#[derive(Clone, Copy, Debug)]
pub struct Limiter {
    /// Sense to base.
    pub sense: Ohm,
    /// Base to output.
    pub base: Ohm,
    /// In parallel with it.
    pub shunt: Option<Ohm>,
    /// Base to rail.
    pub rail: Option<Ohm>,
    /// Turn-on volts at 25 degC.
    pub on: Volt,
}

/// The second slope of a limiter: a zener that holds the middle of a second path from rail to base.
#[derive(Clone, Copy, Debug)]
pub struct LimiterBreak {
    /// Of the zener.
    pub volts: Volt,
    /// Rail to zener.
    pub from_rail: Option<Ohm>,
    /// Zener to base.
    pub to_base: Option<Ohm>,
}

/// The d.c. detector.
#[derive(Clone, Copy, Debug)]
pub struct Detector {
    /// Positive threshold.
    pub above: Volt,
    /// Negative threshold, as a positive number.
    pub below: Volt,
    /// Filter resistor.
    pub ohm: Ohm,
    /// Filter capacitor.
    pub farad: Farad,
    /// `output`, `both-halves`, `across-load`.
    pub watches: &'static str,
}

/// The contacts in the speaker line.
#[derive(Clone, Copy, Debug)]
pub struct Contacts {
    /// In series in one line.
    pub series: u32,
    /// Release time.
    pub release: Option<Second>,
    /// Coil volts.
    pub coil: Option<Volt>,
    /// The unused throw grounds the loudspeaker.
    pub grounded: bool,
}

/// The protection.
#[derive(Clone, Debug)]
pub struct Protection {
    /// Name and header.
    pub owner: Rc<Owner>,
    /// Stated limit line.
    pub limit_line: Field<LimitLine>,
    /// Limiter.
    pub limiter: Field<Limiter>,
    /// Second slope.
    pub limiter_break: Field<LimiterBreak>,
    /// Detector.
    pub detector: Field<Detector>,
    /// What one contact breaks: amps, volts, and whether that is d.c.
    pub relay: Field<Vec<(Amp, Volt, bool)>>,
    /// Contacts.
    pub contacts: Field<Contacts>,
    /// Solid-state switch: volts, amps, how many, release.
    pub switch: Field<(Volt, Amp, u32, Option<Second>)>,
    /// Crowbar: volts, amps.
    pub crowbar: Field<(Volt, Amp)>,
    /// Switch-on delay.
    pub muting: Field<Second>,
    /// Cutout: trip with tolerance (`None`: not stated), its place, how much cooler.
    pub cutout: Field<Cutout>,
}

/// The thermal cutout.
#[derive(Clone, Copy, Debug)]
pub struct Cutout {
    /// Trip temperature.
    pub trip: Spread<Celsius>,
    /// A tolerance is stated.
    pub toleranced: bool,
    /// `device`, `sink`, `chassis`, `air`.
    pub place: &'static str,
    /// How much cooler than the sink beside the devices.
    pub cooler: Option<Kelvin>,
}

/// One mains region.
#[derive(Clone, Debug)]
pub struct Region {
    /// Nominal volts.
    pub nominal: Volt,
    /// Lowest.
    pub low: Volt,
    /// Highest.
    pub high: Volt,
    /// Frequency.
    pub frequency: Hertz,
    /// Resistance of the mains.
    pub loop_resistance: Option<Ohm>,
    /// The primary strap used.
    pub tap: Option<Volt>,
    /// Where it stands.
    pub site: Site,
}

/// How the duty is stated.
#[derive(Clone, Debug, PartialEq)]
pub struct Duty {
    /// Fraction of the power at clip.
    pub fraction: f64,
    /// As written: `1/8`, `full`, `crest 12 dB`.
    pub shown: String,
}

impl Duty {
    /// The duty that a text states, written as on the line of a build: `1/8`, `full`, `crest 12 dB`.
    #[must_use]
    pub fn read(text: &str) -> Option<Self> {
        let tree = ampspec_grammar::parse(format!("build b {{\n duty {text}\n}}\n"));
        let mut lowered = lower(FileId(0), &tree, &HashMap::new());
        let only = lowered.blocks.pop().filter(|_| lowered.blocks.is_empty())?;
        let mut stated = only.lines.iter().filter(|_| lowered.findings.is_empty());
        let line = stated.next().filter(|l| l.groups.len() == 1)?;
        duty(line.groups.first()?).filter(|_| stated.next().is_none())
    }
}

/// Given rails.
#[derive(Clone, Copy, Debug)]
pub struct Rails {
    /// At no load.
    pub idle: Volt,
    /// Loaded.
    pub loaded: Volt,
    /// At this current.
    pub at: Amp,
    /// At high mains, no load.
    pub high: Option<Volt>,
}

/// A build.
#[derive(Clone, Debug)]
pub struct Build {
    /// Name and header.
    pub owner: Rc<Owner>,
    /// The board.
    pub amplifier: Rc<Amplifier>,
    /// Amplifier channels.
    pub channels: Field<u32>,
    /// Joined two by two.
    pub bridged: bool,
    /// The supply and how many channels each feeds.
    pub supply: Field<(Rc<Supply>, u32)>,
    /// Given rails.
    pub rails: Field<Rails>,
    /// The heatsink and how many channels each carries.
    pub heatsink: Field<(Rc<Heatsink>, u32)>,
    /// The protection.
    pub protection: Field<Rc<Protection>>,
    /// How many channels each protection serves, where the build says so.
    pub protected: Option<u32>,
    /// Mains regions.
    pub mains: Field<Vec<Region>>,
    /// Loads, tried in turn.
    pub loads: Field<Vec<Rc<Load>>>,
    /// Coldest and hottest air round the case.
    pub ambient: Field<(Celsius, Celsius)>,
    /// Rise inside.
    pub enclosure: Field<Kelvin>,
    /// Duty, where the build states one.
    pub duty: Field<Duty>,
    /// The policy named.
    pub policy: Field<String>,
    /// A claim to survive a short.
    pub survives_short: bool,
}

impl<'v, 'a> Reader<'v, 'a> {
    /// A reader of this view.
    #[must_use]
    pub fn new(view: &'v View<'a>) -> Self {
        Self {
            view,
            assumed: RefCell::default(),
        }
    }

    /// What was assumed while reading.
    #[must_use]
    pub fn assumed(self) -> Vec<Assumed> {
        self.assumed.into_inner()
    }

    fn page(&self, name: &str, kind: &'static str) -> Option<Page<'_, 'v, 'a>> {
        Some(self.open(self.view.block(name, kind)?, kind))
    }

    fn open(&self, seen: Rc<Seen<'a>>, kind: &'static str) -> Page<'_, 'v, 'a> {
        let owner = Rc::new(Owner {
            kind,
            name: seen.declared.name.clone(),
            site: seen.declared.site,
        });
        Page {
            reader: self,
            seen,
            owner,
        }
    }

    /// The device of this name.
    fn device(&self, name: &str) -> Option<Rc<Device>> {
        let p = self.page(name, "device")?;
        let kind = p.seen.flavour;
        let mosfet = matches!(kind, Some("nmos" | "pmos")) || p.seen.line("vdss").is_some();
        let power = p.one("power", |g| {
            Some((get(g, "W")?, get(g, "degC").unwrap_or(Celsius(25.0))))
        });
        let junction: Field<Celsius> = p.si("junction", "degC");
        let mut junction_case: Field<KelvinPerWatt> = p.si("junction-case", "K/W");
        if let (true, Some((watt, case)), Some(tj)) = (
            junction_case.unstated(),
            power.get().copied(),
            junction.get(),
        ) {
            let value = (*tj - case) / watt;
            if watt > Watt::ZERO && value > KelvinPerWatt::ZERO {
                junction_case = p.or(
                    junction_case,
                    value,
                    Measure::new(value.0, "K/W"),
                    "(Tj,max - 25 degC) / Ptot",
                );
            }
        }
        let mut soa: Vec<SoaLine> = p
            .seen
            .all("soa")
            .filter_map(|line| {
                let pulse = match line.select {
                    Some(Select::Time(s)) => Some(Second(s)),
                    _ => None,
                };
                let points = line
                    .groups
                    .iter()
                    .map(|g| Some((get(g, "V")?, get(g, "A")?)))
                    .collect::<Option<_>>()?;
                Some(SoaLine {
                    pulse,
                    points,
                    site: line.site,
                })
            })
            .collect();
        soa.sort_by(|a, b| {
            let length = |l: &SoaLine| l.pulse.map_or(f64::INFINITY, |s| s.0);
            length(b).total_cmp(&length(a))
        });
        let hfe: Vec<GainLine> = p
            .seen
            .all("hfe")
            .filter_map(|line| {
                let points = line
                    .groups
                    .iter()
                    .map(|g| Some((get(g, "A")?, g.number("num")?)))
                    .collect::<Option<_>>()?;
                Some(GainLine {
                    minimum: line.select == Some(Select::Word("minimum")),
                    points,
                    site: line.site,
                })
            })
            .collect();
        let mut soa_dc = p.field("soa", |_| None::<()>);
        if let Some(line) = soa.iter().find(|l| l.pulse.is_none()) {
            soa_dc.value = Some(());
            soa_dc.line = Some(line.site);
        }
        let mut hfe_field = p.field("hfe", |_| None::<()>);
        hfe_field.value = hfe.first().map(|_| ());
        let vbe = p.one("vbe", |g| Some((get(g, "V")?, get(g, "A"))));
        let vbe = if mosfet {
            vbe
        } else {
            p.or(
                vbe,
                (Volt(0.65), None),
                Measure::new(0.65, "V"),
                "usual for silicon",
            )
        };
        let codes = p
            .seen
            .group("part")
            .map(|g| {
                ["text", "text2"]
                    .iter()
                    .filter_map(|s| g.text(s).map(str::to_owned))
                    .collect()
            })
            .unwrap_or_default();
        Some(Rc::new(Device {
            flavour: if mosfet {
                Flavour::Mosfet
            } else {
                Flavour::Bipolar
            },
            kind,
            breakdown: if mosfet {
                p.si("vdss", "V")
            } else {
                p.si("vceo", "V")
            },
            gate_limit: p.si("vgs", "V"),
            structure: p.word("structure", "lateral"),
            gate_source: p.points("gate-source", "V", "A"),
            gate_drift: p.points("gate-drift", "mV/K", "A"),
            on_resistance: p.si("on-resistance", "ohm"),
            second_breakdown: p.si("second-breakdown", "%/K"),
            current: p.si("current", "A"),
            peak_current: p.si("current", "peak"),
            base: p.si("base", "A"),
            power,
            junction,
            junction_case,
            foster: p.points("foster", "K/W", "s"),
            soa,
            soa_dc,
            hfe,
            hfe_field,
            vbe,
            transition: p.one("transition", |g| Some((get(g, "Hz")?, get(g, "A")))),
            codes,
            source: p.word("source", "authorised"),
            owner: p.owner.clone(),
        }))
    }

    fn stage(&self, name: &str) -> Option<Rc<Stage>> {
        let p = self.page(name, "stage")?;
        let group = p.seen.group("devices");
        let upper_name = group.and_then(|g| g.name("device"));
        let lower_name = group.and_then(|g| g.name("device2")).or(upper_name);
        // a stage that names no known device still answers for what its other lines say
        let upper = upper_name
            .and_then(|n| self.device(n))
            .unwrap_or_else(|| self.nobody(&p));
        let lower = match lower_name {
            Some(n) if Some(n) != upper_name => self.device(n).unwrap_or_else(|| self.nobody(&p)),
            _ => upper.clone(),
        };
        let resistor = |g: &Group| {
            Some(Resistor {
                ohm: spread(g, "ohm")?,
                watt: get(g, "W"),
                pulse: get(g, "pulse"),
            })
        };
        let connection = p.word("connection", "emitter-follower");
        let usual = if upper.flavour == Flavour::Mosfet {
            "source-follower"
        } else {
            "emitter-follower"
        };
        let connection = *connection.get().unwrap_or(&usual);
        let mut devices = p.field("devices", |_| None::<()>);
        devices.value = upper_name.map(|_| ());
        let pairs = p.one("pairs", |g| count(g, "n"));
        let pairs = p.or(pairs, 1, Measure::new(1.0, "1"), "one pair");
        Some(Rc::new(Stage {
            connection,
            bought: group.map(|g| g.bought.clone()).unwrap_or_default(),
            emitter: p.one("emitter", resistor),
            emitter_bought: p.seen.group("emitter").map(|g| g.bought.clone()),
            base_emitter: p.one("base-emitter", resistor),
            idle: p.field("idle", |groups| Some(groups.iter().map(idle).collect())),
            insulator: p.si("insulator", "K/W"),
            own_sink: p.one("own-sink", |g| Some((get(g, "K/W")?, g.per()?.0))),
            vbe_spread: if pairs.get().is_some_and(|n| *n > 1) && upper.flavour == Flavour::Bipolar
            {
                p.or(
                    p.si("vbe-spread", "V"),
                    Volt(0.02),
                    Measure::new(0.02, "V"),
                    "usual between unmatched devices",
                )
            } else {
                p.si("vbe-spread", "V")
            },
            spread_across_sink: p.or(
                p.si("spread-across-sink", "K"),
                Kelvin::ZERO,
                Measure::new(0.0, "K"),
                "the default",
            ),
            gate_zener: p.si("gate-zener", "V"),
            driver_rail: p.si("driver-rail", "V"),
            sensor: p.one("sensor", |g| Some((g.word("on")?, get(g, "cooler")))),
            output_current: p.si("output-current", "A"),
            tail: p.one("tail", |g| Some((get(g, "A")?, get(g, "compensation")?))),
            upper,
            lower,
            devices,
            pairs,
            owner: p.owner.clone(),
        }))
    }

    /// A device of which nothing is known: every rule that needs it says which key is missing.
    fn nobody(&self, p: &Page<'_, 'v, 'a>) -> Rc<Device> {
        let owner = Rc::new(Owner {
            kind: "stage",
            name: format!("{} devices", p.owner.name),
            site: p.owner.site,
        });
        fn blank<T>(owner: &Rc<Owner>, key: &'static str) -> Field<T> {
            Field {
                value: None,
                line: None,
                none: false,
                assumed: false,
                owner: owner.clone(),
                key,
            }
        }
        Rc::new(Device {
            flavour: Flavour::Bipolar,
            kind: None,
            breakdown: blank(&owner, "vceo"),
            gate_limit: blank(&owner, "vgs"),
            structure: blank(&owner, "structure"),
            gate_source: blank(&owner, "gate-source"),
            gate_drift: blank(&owner, "gate-drift"),
            on_resistance: blank(&owner, "on-resistance"),
            second_breakdown: blank(&owner, "second-breakdown"),
            current: blank(&owner, "current"),
            peak_current: blank(&owner, "current"),
            base: blank(&owner, "base"),
            power: blank(&owner, "power"),
            junction: blank(&owner, "junction"),
            junction_case: blank(&owner, "junction-case"),
            foster: blank(&owner, "foster"),
            soa: Vec::new(),
            soa_dc: blank(&owner, "soa"),
            hfe: Vec::new(),
            hfe_field: blank(&owner, "hfe"),
            vbe: blank(&owner, "vbe"),
            transition: blank(&owner, "transition"),
            codes: Vec::new(),
            source: blank(&owner, "source"),
            owner,
        })
    }

    fn reservoir(groups: &[Group]) -> Option<Vec<Reservoir>> {
        groups
            .iter()
            .map(|g| {
                Some(Reservoir {
                    count: g.count(),
                    farad: spread(g, "F")?,
                    volt: get(g, "V")?,
                    esr: get(g, "esr"),
                    ripple: get(g, "ripple"),
                    life: get(g, "life").zip(get(g, "life-at")),
                    bought: g.bought.clone(),
                    site: g.site,
                })
            })
            .collect()
    }

    /// Capacitors are sold ±20 %; used, and listed, where no tolerance is stated.
    fn reservoirs(&self, p: &Page<'_, 'v, 'a>, key: &'static str) -> Field<Vec<Reservoir>> {
        let mut field = p.field(key, Self::reservoir);
        let toleranced = |g: &Group| g.quantity("F").is_some_and(|q| q.tolerance.is_some());
        let bare = p
            .seen
            .line(key)
            .is_some_and(|l| !l.groups.iter().all(toleranced));
        if let (true, Some(all)) = (bare, field.value.as_mut()) {
            for one in all.iter_mut().filter(|r| r.farad.low == r.farad.high) {
                one.farad.low = one.farad.nominal * 0.8;
                one.farad.high = one.farad.nominal * 1.2;
            }
            p.assume(
                &format!("{key} tolerance"),
                Measure::new(20.0, "%"),
                "usual for aluminium electrolytics",
            );
        }
        field
    }

    fn amplifier(&self, name: &str) -> Option<Rc<Amplifier>> {
        let p = self.page(name, "amplifier")?;
        let stage = |key: &str| {
            p.seen
                .group(key)
                .and_then(|g| g.name("stage"))
                .and_then(|n| self.stage(n))
        };
        let output = stage("output")?;
        let named = |key: &'static str, found: bool| {
            let mut field = p.field(key, |_| None::<()>);
            field.value = found.then_some(());
            field
        };
        let (driver, voltage_amplifier) = (stage("driver"), stage("voltage-amplifier"));
        let network = p
            .seen
            .group("network")
            .and_then(|g| g.name("network"))
            .and_then(|n| self.network(n));
        let claims = |groups: &[Group]| groups.iter().map(claim).collect();
        let rated = p.field("rated", claims);
        if let Some(line) = p.seen.line("rated").filter(|l| !l.none) {
            if line.groups.iter().any(|g| g.word("one-channel").is_none()) {
                p.assume("rated channels", None, "all channels driven");
            }
            if line
                .groups
                .iter()
                .any(|g| g.word("nominal-mains").is_none())
            {
                p.assume("rated mains", None, "nominal mains");
            }
        }
        let reservoirs = self.reservoirs(&p, "board-reservoir");
        let board_reservoir = Field {
            value: reservoirs.value.and_then(|v| v.into_iter().next()),
            line: reservoirs.line,
            none: reservoirs.none,
            assumed: false,
            owner: p.owner.clone(),
            key: "board-reservoir",
        };
        Some(Rc::new(Amplifier {
            driver_field: named("driver", driver.is_some()),
            voltage_field: named("voltage-amplifier", voltage_amplifier.is_some()),
            network_field: named("network", network.is_some()),
            predriver: stage("predriver"),
            rated,
            band: p.or(
                p.one("band", |g| {
                    range(g, "Hz").map(|(a, b)| (Hertz(a), Hertz(b)))
                }),
                (Hertz(20.0), Hertz(20e3)),
                Measure::new(20.0, "Hz"),
                "20 Hz to 20 kHz",
            ),
            drop: p.field("drop", |groups| {
                groups
                    .iter()
                    .map(|g| Some((get(g, "V")?, get(g, "A"))))
                    .collect()
            }),
            gain: p.si("gain", "dB"),
            channels_per_board: p.or(
                p.one("channels-per-board", |g| count(g, "n")),
                1,
                Measure::new(1.0, "1"),
                "the default",
            ),
            board_reservoir,
            output,
            driver,
            voltage_amplifier,
            network,
            owner: p.owner.clone(),
        }))
    }

    fn network(&self, name: &str) -> Option<Network> {
        let p = self.page(name, "network")?;
        Some(Network {
            zobel: p.one("zobel", |g| {
                Some((get(g, "ohm")?, get(g, "W")?, get(g, "F")?, get(g, "V")))
            }),
            coil: p.one("coil", |g| {
                Some((get(g, "H")?, get(g, "damp"), get(g, "W")))
            }),
            owner: p.owner.clone(),
        })
    }

    fn load(&self, name: &str, depth: usize) -> Option<Rc<Load>> {
        if depth > 8 {
            return None;
        }
        let p = self.page(name, "load")?;
        let nominal: Field<Ohm> = p.si("nominal", "ohm");
        let mut line = p.field("resistive", |_| Some(()));
        let kind = if let Some(r) = p.seen.group("resistive").and_then(|g| spread(g, "ohm")) {
            LoadKind::Resistive(r)
        } else if let Some(g) = p.seen.group("table") {
            line = p.field("table", |_| Some(()));
            let site = g.get("text").map_or(g.site, |s: &Slot| s.site);
            g.text("text")
                .map_or(LoadKind::Unstated, |t| LoadKind::Table(t.to_owned(), site))
        } else if let Some((re, le, lossy)) = p
            .seen
            .group("voice-coil")
            .and_then(|g| Some((get(g, "ohm")?, get(g, "H")?, g.number("lossy"))))
        {
            line = p.field("voice-coil", |_| Some(()));
            let resonances = p.seen.all("resonance").flat_map(|l| &l.groups);
            let resonances = resonances.filter_map(|g| {
                Some((
                    get(g, "Hz")?,
                    g.number("mechanical")?,
                    g.number("electrical")?,
                ))
            });
            LoadKind::VoiceCoil(re, le, lossy, resonances.collect())
        } else if let Some(parallel) = p.seen.line("parallel").filter(|l| !l.none) {
            line = p.field("parallel", |_| Some(()));
            let loads: Option<Vec<_>> = parallel
                .groups
                .iter()
                .map(|g| self.load(g.name("load")?, depth + 1))
                .collect();
            loads.map_or(LoadKind::Unstated, LoadKind::Parallel)
        } else if let Some(z) = nominal.get().copied() {
            line = p.field("nominal", |_| Some(()));
            let minimum = p.or(
                p.si("minimum", "ohm"),
                z * 0.8,
                Measure::new(0.8 * z.0, "ohm"),
                "80 % of nominal",
            );
            LoadKind::Nominal(z, minimum, p.si("angle", "deg"))
        } else {
            LoadKind::Unstated
        };
        Some(Rc::new(Load {
            kind,
            line,
            nominal,
            dc: p.si("dc", "ohm"),
            endurance: p.one("endurance", |g| {
                let (joule, watt) = (get(g, "J"), get(g, "W"));
                (joule.is_some() || watt.is_some()).then_some((joule, watt))
            }),
            owner: p.owner.clone(),
        }))
    }

    fn heatsink(&self, name: &str) -> Option<Rc<Heatsink>> {
        let p = self.page(name, "heatsink")?;
        if p.seen
            .group("resistance")
            .is_some_and(|g| g.number("K").is_none())
        {
            p.assume(
                "resistance at",
                Measure::new(50.0, "K"),
                "usual for catalogue figures",
            );
        }
        let metres = |g: &Group, slots: [&str; 3]| {
            Some([
                g.number(slots[0])?,
                g.number(slots[1])?,
                g.number(slots[2])?,
            ])
        };
        Some(Rc::new(Heatsink {
            resistance: p.one("resistance", |g| {
                Some((get(g, "K/W")?, get(g, "K").unwrap_or(Kelvin(50.0))))
            }),
            mass: p.si("mass", "kg"),
            touchable: p.word("touchable", "no"),
            plate: p.one("plate", |g| metres(g, ["width", "height", "thick"])),
            fins: p.one("fins", |g| {
                Some((
                    count(g, "n")?,
                    metres(g, ["length", "thick", "gap"])?,
                    g.word("vertical")? == "vertical",
                ))
            }),
            owner: p.owner.clone(),
        }))
    }

    fn transformer(&self, name: &str) -> Option<Rc<Transformer>> {
        let p = self.page(name, "transformer")?;
        let secondary = p.one("secondary", |g| {
            let volt: Volt = get(g, "V")?;
            let total = g.word("centre-tapped-total").is_some();
            Some(if total {
                (2 * g.count(), volt / 2.0)
            } else {
                (g.count(), volt)
            })
        });
        let per = p.seen.group("rating").and_then(Group::per);
        let per_winding = per.is_some_and(|per| per.0 == "winding");
        if p.seen.group("rating").is_some() && per.is_none() {
            p.assume("rating per", None, "per transformer");
        }
        let windings = secondary.get().map_or(1, |s| s.0);
        let times = if per_winding {
            f64::from(windings)
        } else {
            1.0
        };
        let rating: Field<f64> = p.one("rating", |g| Some(g.number("VA")? * times));
        let of_no_load = p
            .seen
            .group("regulation")
            .is_some_and(|g| g.word("of") == Some("no-load"));
        let regulation = p.one("regulation", |g| {
            let x = g.number("%")?;
            let rho = if of_no_load { x / (1.0 - x) } else { x };
            (rho.is_finite() && rho > 0.0).then_some(rho)
        });
        Some(Rc::new(Transformer {
            primary: p.field("primary", |groups| {
                groups.iter().map(|g| get(g, "V")).collect()
            }),
            secondary,
            rating,
            per_winding,
            regulation,
            resistance: p.one("resistance", |g| {
                Some((get(g, "primary")?, get(g, "secondary")?))
            }),
            thermal_fuse: p.si("thermal-fuse", "degC"),
            owner: p.owner.clone(),
        }))
    }

    fn supply(&self, name: &str) -> Option<Rc<Supply>> {
        let p = self.page(name, "supply")?;
        let group = p.seen.group("transformer")?;
        let transformer = self.transformer(group.name("transformer")?)?;
        let rectifier = p.one("rectifier", |g| {
            Some(Rectifier {
                bridges: g.count(),
                reverse: get(g, "V"),
                mean: get(g, "A"),
                surge: get(g, "surge"),
                drop: get(g, "drop").unwrap_or(Volt(0.9)),
            })
        });
        if p.seen
            .group("rectifier")
            .is_some_and(|g| g.number("drop").is_none())
        {
            p.assume(
                "rectifier drop",
                Measure::new(0.9, "V"),
                "usual for one silicon diode",
            );
        }
        let mut fuses = Vec::new();
        for line in p.seen.all("fuse") {
            let Some(Select::Word(place)) = line.select else {
                continue;
            };
            for g in &line.groups {
                let Some((rating, speed)) = get(g, "A").zip(g.word("slow")) else {
                    continue;
                };
                fuses.push(FuseLine {
                    place,
                    rating,
                    slow: speed == "slow",
                    melts: get(g, "melts"),
                    tap: get(g, "tap"),
                    per: g.per().map(|per| per.0),
                    site: g.site,
                });
            }
        }
        let fuse_field = |place: &'static str, key: &'static str| {
            let line = p.seen.lines.iter().find(|l| {
                l.key.name == "fuse"
                    && (l.select == Some(Select::Word(place)) || l.select.is_none())
            });
            Field {
                value: line.filter(|l| !l.none && !l.groups.is_empty()).map(|_| ()),
                line: line.map(|l| l.site),
                none: line.is_some_and(|l| l.none),
                assumed: false,
                owner: p.owner.clone(),
                key,
            }
        };
        let soft_start = p.one("soft-start", |g| {
            let (cold, hot) = match get(g, "ntc") {
                Some(cold) => (cold, get(g, "hot")),
                None => (get(g, "ohm")?, None),
            };
            Some(SoftStart {
                cold,
                hot,
                watt: get(g, "W"),
                bypass: get(g, "bypass"),
                energy: get(g, "energy"),
                thermal_fuse: get(g, "thermal-fuse"),
            })
        });
        Some(Rc::new(Supply {
            transformers: group.count(),
            transformer,
            transformer_field: p.field("transformer", |_| Some(())),
            rectifier,
            reservoir: self.reservoirs(&p, "reservoir"),
            bleeder: p.one("bleeder", |g| {
                let resistor = Resistor {
                    ohm: spread(g, "ohm")?,
                    watt: get(g, "W"),
                    pulse: None,
                };
                Some((resistor, g.per()?.0 == "supply"))
            }),
            mains_fuse: fuse_field("mains", "fuse mains"),
            rail_fuse: fuse_field("rail", "fuse rail"),
            fuses,
            soft_start,
            wiring: p.or(
                p.si("wiring", "ohm"),
                Ohm::ZERO,
                Measure::new(0.0, "ohm"),
                "the default",
            ),
            touchable: p.seen.group("terminals").and_then(|g| g.word("enclosed"))
                == Some("touchable"),
            owner: p.owner.clone(),
        }))
    }

    fn protection(&self, name: &str) -> Option<Rc<Protection>> {
        let p = self.page(name, "protection")?;
        let limit_line = p.field("limit-line", |groups| {
            let points = groups
                .iter()
                .map(|g| Some((get(g, "V")?, get(g, "A")?)))
                .collect::<Option<_>>()?;
            let bank = p.seen.line("limit-line")?.select == Some(Select::Word("bank"));
            Some(LimitLine { bank, points })
        });
        let limiter = p.one("limiter", |g| {
            Some(Limiter {
                sense: get(g, "sense")?,
                base: get(g, "base")?,
                shunt: get(g, "shunt"),
                rail: get(g, "rail"),
                on: get(g, "on").unwrap_or(Volt(0.6)),
            })
        });
        if p.seen
            .group("limiter")
            .is_some_and(|g| g.number("on").is_none())
        {
            p.assume(
                "limiter on",
                Measure::new(0.6, "V"),
                "usual for a small silicon transistor",
            );
        }
        let contacts = p.one("contacts", |g| {
            Some(Contacts {
                series: count(g, "series").unwrap_or(1),
                release: get(g, "release"),
                coil: get(g, "coil"),
                grounded: g.word("open") == Some("grounded"),
            })
        });
        let relay = p.field("relay", |groups| {
            groups
                .iter()
                .map(|g| {
                    Some((
                        get(g, "A")?,
                        get(g, "V")?,
                        g.quantity("V")?.form != Form::Rms,
                    ))
                })
                .collect()
        });
        let detector = p.one("detector", |g| {
            let above: Volt = get(g, "V")?;
            let below = get::<Volt>(g, "below").map_or(above, Volt::abs);
            Some(Detector {
                above: above.abs(),
                below,
                ohm: get(g, "ohm")?,
                farad: get(g, "F")?,
                watches: g.word("watches")?,
            })
        });
        Some(Rc::new(Protection {
            limit_line,
            limiter,
            limiter_break: p.one("limiter-break", |g| {
                Some(LimiterBreak {
                    volts: get(g, "V")?,
                    from_rail: get(g, "from-rail"),
                    to_base: get(g, "to-base"),
                })
            }),
            detector,
            relay,
            contacts,
            switch: p.one("switch", |g| {
                Some((get(g, "V")?, get(g, "A")?, g.count(), get(g, "release")))
            }),
            crowbar: p.one("crowbar", |g| Some((get(g, "V")?, get(g, "A")?))),
            muting: p.si("muting", "s"),
            cutout: p.one("cutout", |g| {
                let toleranced = g.quantity("degC")?.tolerance.is_some();
                Some(Cutout {
                    trip: spread(g, "degC")?,
                    toleranced,
                    place: g.word("on")?,
                    cooler: get(g, "cooler"),
                })
            }),
            owner: p.owner.clone(),
        }))
    }

    /// The build of the view. `None` when it reaches no amplifier: the missing name is a finding of
    /// its own.
    ///
    /// # Errors
    /// The names of what is missing.
    pub fn build(&self) -> Result<Build, Needs> {
        let seen = Rc::new(self.view.seen(self.view.build));
        let p = self.open(seen, "build");
        let only = || {
            let mut all = self.view.project.of_kind("amplifier");
            let first = all.next()?;
            all.next().is_none().then(|| first.name.clone())
        };
        let name = p
            .seen
            .group("amplifier")
            .and_then(|g| g.name("amplifier"))
            .map(str::to_owned)
            .or_else(only);
        let unnamed = p.field::<()>("amplifier", |_| None);
        let amplifier =
            name.as_deref()
                .and_then(|n| self.amplifier(n))
                .ok_or_else(|| match &name {
                    None => unnamed.missing(),
                    Some(name) => {
                        let site = self
                            .view
                            .project
                            .find(self.view.name(name))
                            .map_or(p.owner.site, |d| d.site);
                        Needs {
                            keys: vec![Need {
                                key: format!("amplifier {name} output"),
                                site,
                            }],
                            because: String::new(),
                        }
                    }
                })?;
        let channels = p.one("channels", |g| count(g, "n").filter(|n| *n > 0));
        let total = channels.get().copied().unwrap_or(1);
        let per_board = amplifier
            .channels_per_board
            .get()
            .copied()
            .unwrap_or(1)
            .max(1);
        let carried = |g: &Group| {
            g.per().map(|(word, n)| match word {
                "build" => total,
                "board" => per_board,
                _ => n.max(1),
            })
        };
        let supply = p.one("supply", |g| {
            Some((self.supply(g.name("supply")?)?, carried(g)?.min(total)))
        });
        let heatsink = p.one("heatsink", |g| {
            Some((self.heatsink(g.name("heatsink")?)?, carried(g)?.min(total)))
        });
        let mains = p.field("mains", |groups| {
            groups.iter().map(|g| self.region(&p, g)).collect()
        });
        let duty = p.one("duty", duty);
        Ok(Build {
            bridged: p
                .seen
                .group("channels")
                .and_then(|g| g.word("bridged"))
                .is_some(),
            supply,
            rails: p.one("rails", |g| {
                Some(Rails {
                    idle: get(g, "idle")?,
                    loaded: get(g, "loaded")?,
                    at: get(g, "A")?,
                    high: get(g, "high"),
                })
            }),
            heatsink,
            protection: p.one("protection", |g| self.protection(g.name("protection")?)),
            protected: p.seen.group("protection").and_then(carried),
            mains,
            loads: p.field("loads", |groups| {
                groups
                    .iter()
                    .map(|g| self.load(g.name("load")?, 0))
                    .collect()
            }),
            ambient: p.one("ambient", |g| match &g.get("degC")?.value {
                Value::Range(a, b) => Some((Celsius(a.value), Celsius(b.value))),
                Value::Quantity(q) => Some((Celsius(q.value), Celsius(q.value))),
                _ => None,
            }),
            enclosure: p.or(
                p.si("enclosure", "K"),
                Kelvin::ZERO,
                Measure::new(0.0, "K"),
                "the default",
            ),
            duty,
            policy: p.one("policy", |g| {
                g.name("policy").map(|n| self.view.name(n).to_owned())
            }),
            survives_short: p.seen.group("survives-short").and_then(|g| g.word("yes"))
                == Some("yes"),
            amplifier,
            channels,
            owner: p.owner.clone(),
        })
    }

    fn region(&self, p: &Page<'_, 'v, 'a>, g: &Group) -> Option<Region> {
        let nominal = g.quantity("V")?;
        let (low, high) = match range(g, "range") {
            Some(ends) => ends,
            None if nominal.tolerance.is_some() => bounds(nominal),
            None => {
                p.assume(
                    "mains range",
                    Measure::new(10.0, "%"),
                    "IEC 60038 allows +-10 %",
                );
                (0.9 * nominal.value, 1.1 * nominal.value)
            }
        };
        Some(Region {
            nominal: Volt(nominal.value),
            low: Volt(low.min(nominal.value)),
            high: Volt(high.max(nominal.value)),
            frequency: get(g, "Hz")?,
            loop_resistance: get(g, "loop"),
            tap: get(g, "tap"),
            site: g.site,
        })
    }
}

/// A duty of a build or a policy.
#[must_use]
pub fn duty(g: &Group) -> Option<Duty> {
    if let Some(Value::Fraction(fraction, shown)) = g.get("fraction").map(|s| &s.value) {
        return Some(Duty {
            fraction: *fraction,
            shown: shown.clone(),
        });
    }
    if g.word("full").is_some() {
        return Some(Duty {
            fraction: 1.0,
            shown: "full".to_owned(),
        });
    }
    let crest = g.number("crest")?;
    // a sine that just clips has a crest factor of 3.01 dB: full power
    let fraction = crate::physics::math::pow(
        10.0,
        (10.0 * crate::physics::math::log10(2.0) - crest) / 10.0,
    )
    .min(1.0);
    Some(Duty {
        fraction,
        shown: format!("crest {crest} dB"),
    })
}

fn claim(g: &Group) -> Option<Claim> {
    Some(Claim {
        power: get(g, "W")?,
        load: get(g, "ohm")?,
        all_channels: g.word("one-channel") != Some("one-channel"),
        low_mains: g.word("nominal-mains") == Some("low-mains"),
        site: g.site,
    })
}

fn idle(g: &Group) -> Idle {
    Idle {
        current: get(g, "A"),
        volts: get(g, "V"),
        per: g.per().map(|p| p.0),
        across: g.word("across"),
        site: g.site,
    }
}

fn range(g: &Group, slot: &str) -> Option<(f64, f64)> {
    match &g.get(slot)?.value {
        Value::Range(a, b) => Some((a.value, b.value)),
        _ => None,
    }
}

fn count(g: &Group, slot: &str) -> Option<u32> {
    let n = g.number(slot)?;
    // whole and small: checked when the line was read
    (n.fract() == 0.0 && (0.0..=1e4).contains(&n)).then_some(n as u32)
}
