//! What a check produces: margins, findings and the report that holds them, on byte positions.
//! Must not know how any of it is shown, nor how a number was computed.

use ampspec_grammar::Span;

use crate::curves::Picture;

/// Which file of a [`crate::source::Sources`] a position is in.
#[derive(Clone, Copy, Debug, PartialEq, Eq, Hash, PartialOrd, Ord)]
pub struct FileId(pub u32);

/// A place in a file.
#[derive(Clone, Copy, Debug, PartialEq, Eq, Hash, PartialOrd, Ord)]
pub struct Site {
    /// The file.
    pub file: FileId,
    /// The bytes.
    pub span: Span,
}

/// A further place that led to a finding.
#[derive(Clone, Debug, PartialEq, Eq)]
pub struct Related {
    /// What this place contributed.
    pub message: String,
    /// Where it is.
    pub site: Site,
}

/// How loud a finding is.
#[derive(Clone, Copy, Debug, PartialEq, Eq, Hash, PartialOrd, Ord)]
pub enum Severity {
    /// Shown, never fails a run unless asked to.
    Information,
    /// Outside its allowance, inside its rating.
    Warning,
    /// Past a rating, or text that could not be understood.
    Error,
}

/// The outcome of one comparison. Compared before rounding.
#[derive(Clone, Copy, Debug, PartialEq, Eq, Hash, PartialOrd, Ord)]
pub enum Verdict {
    /// stress <= allowance.
    Ok,
    /// An input is missing, or the data end before the stress.
    Unchecked,
    /// allowance < stress <= rating.
    Thin,
    /// stress > rating.
    Over,
}

/// A number with the unit it is printed in (SI base unit, or `%`, `degC`, `1`).
#[derive(Clone, Copy, Debug, PartialEq)]
pub struct Measure {
    /// The value in that unit.
    pub value: f64,
    /// The unit as the language spells it.
    pub unit: &'static str,
}

impl Measure {
    /// A value with its unit.
    #[must_use]
    pub const fn new(value: f64, unit: &'static str) -> Self {
        Self { value, unit }
    }
}

/// The declared part a margin is about.
#[derive(Clone, Debug, PartialEq, Eq, Default)]
pub struct Part {
    /// The declared name (`n16`), or block and key where the part has no name (`toroid reservoir`).
    pub name: String,
    /// The block whose line fixes its use (`out`).
    pub block: String,
    /// The key of that line (`devices`).
    pub key: &'static str,
    /// `upper` or `lower` where the part has one.
    pub polarity: Option<&'static str>,
    /// Designators, expanded.
    pub refs: Vec<String>,
    /// How many the build holds, where it can be worked out.
    pub quantity: Option<u32>,
    /// Order code, where stated.
    pub order_code: Option<String>,
}

/// The operating point at which the stress is worst. A field that plays no part is `None`.
#[derive(Clone, Debug, PartialEq, Default)]
pub struct Witness {
    /// Mains volts r.m.s.
    pub mains_v: Option<f64>,
    /// Mains frequency, Hz.
    pub mains_hz: Option<f64>,
    /// Tolerances taken at an extreme: part, and `low` or `high`.
    pub tolerance: Vec<(String, &'static str)>,
    /// Channels driven at once.
    pub channels_driven: Option<u32>,
    /// Load name.
    pub load: Option<String>,
    /// Signal frequency, Hz.
    pub frequency_hz: Option<f64>,
    /// Peak of the output voltage, V.
    pub amplitude_v: Option<f64>,
    /// Power into the load, W.
    pub power_w: Option<f64>,
    /// Angle of the signal at the worst instant, degrees.
    pub angle_deg: Option<f64>,
    /// The duty in force (`1/8`).
    pub duty: Option<String>,
    /// Ambient, degC.
    pub ambient_c: Option<f64>,
    /// Heatsink, degC.
    pub sink_c: Option<f64>,
    /// Case, degC.
    pub case_c: Option<f64>,
    /// Junction, degC.
    pub junction_c: Option<f64>,
    /// Rail to ground, V.
    pub rail_v: Option<f64>,
    /// Across the device, V.
    pub device_v: Option<f64>,
    /// Through the device, A.
    pub device_a: Option<f64>,
    /// Through the bank, A.
    pub bank_a: Option<f64>,
    /// The safe-area curve used (`dc`, `100 ms`).
    pub curve: Option<String>,
    /// Points that tie with this one, at most three.
    pub also_at: Vec<String>,
}

/// One line of the working: a symbol, how it was had, and its value.
#[derive(Clone, Debug, PartialEq)]
pub struct Step {
    /// `V0`.
    pub symbol: &'static str,
    /// `rail, no load, high mains`.
    pub meaning: &'static str,
    /// `m·√2·Vs·(1+ρ)`, or empty for a stated value.
    pub expression: &'static str,
    /// The number in `unit`.
    pub value: f64,
    /// Its unit.
    pub unit: &'static str,
    /// Published source of the expression, or empty.
    pub source: &'static str,
    /// The lines it was read from.
    pub from: Vec<Site>,
}

/// A replacement of text.
#[derive(Clone, Debug, PartialEq, Eq)]
pub struct TextEdit {
    /// What is replaced.
    pub site: Site,
    /// By what.
    pub text: String,
}

/// Another margin that a proposed change moves by more than a point.
#[derive(Clone, Debug, PartialEq)]
pub struct AlsoMoves {
    /// Its [`Margin::id`].
    pub id: String,
    /// Used before, per cent.
    pub used_before: f64,
    /// Used after, per cent.
    pub used_after: f64,
}

/// A change that was re-solved and clears the margin it is offered for.
#[derive(Clone, Debug, PartialEq)]
pub struct Change {
    /// In words: `3 pairs instead of 2`.
    pub title: String,
    /// As lines of the language: `change out pairs 3`.
    pub statements: Vec<String>,
    /// As text replacements in the file.
    pub edits: Vec<TextEdit>,
    /// Used after the change, per cent.
    pub used_after: f64,
    /// What else moves.
    pub also_moves: Vec<AlsoMoves>,
}

/// One comparison of one part in one build.
#[derive(Clone, Debug, PartialEq)]
pub struct Margin {
    /// `build/alternate/block.key/rule`, `-` for no alternate; a part name is added where one line holds two.
    pub id: String,
    /// `soa.reactive`.
    pub rule: &'static str,
    /// What it is about.
    pub part: Part,
    /// The outcome, before any waiver.
    pub verdict: Verdict,
    /// After policy.
    pub severity: Severity,
    /// Index into [`Report::waivers`] where one accepts this margin.
    pub waiver: Option<usize>,
    /// The baseline of this run holds it: it was found before, and fails nothing.
    pub known: bool,
    /// What the part sees.
    pub stress: Option<Measure>,
    /// What the data sheet, or the policy's hard limit, allows.
    pub rating: Option<Measure>,
    /// What the policy allows.
    pub allowance: Option<Measure>,
    /// 100 x stress / allowance and its kin; `None` where unchecked or where no rating is left.
    pub used_percent: Option<f64>,
    /// The missing keys, `device n16 junction-case`.
    pub needs: Vec<String>,
    /// Why this one is unchecked, or what kind of over it is, in words; empty where the numbers say it.
    pub note: String,
    /// The worst operating point.
    pub witness: Witness,
    /// How the numbers were had.
    pub working: Vec<Step>,
    /// The line to blame.
    pub site: Site,
    /// The other lines that take part.
    pub related: Vec<Related>,
    /// Changes that clear it, filled on request.
    pub changes: Vec<Change>,
}

impl Margin {
    /// 100 - used, in points.
    #[must_use]
    pub fn margin_percent(&self) -> Option<f64> {
        self.used_percent.map(|used| 100.0 - used)
    }
}

/// A finding about the text or the data, which compares no stress.
#[derive(Clone, Debug, PartialEq)]
pub struct Finding {
    /// `data.unit-suspect`, or `syntax.…` for text that does not parse.
    pub rule: &'static str,
    /// How loud.
    pub severity: Severity,
    /// What is wrong.
    pub message: String,
    /// What to do.
    pub hint: String,
    /// For an ambiguous text: each reading and what it would mean.
    pub readings: Vec<(String, String)>,
    /// Where.
    pub site: Site,
    /// The other places.
    pub related: Vec<Related>,
    /// Replacements that would settle it, one alternative each.
    pub edits: Vec<TextEdit>,
    /// Index into [`Report::waivers`] where one accepts this finding.
    pub waiver: Option<usize>,
    /// The baseline of this run holds it: it was found before, and fails nothing.
    pub known: bool,
    /// The build it is about, where it is about one.
    pub build: Option<String>,
}

impl Finding {
    /// An error at a place, nothing more.
    #[must_use]
    pub fn error(rule: &'static str, site: Site, message: String, hint: String) -> Self {
        Self {
            rule,
            severity: Severity::Error,
            message,
            hint,
            readings: Vec::new(),
            site,
            related: Vec::new(),
            edits: Vec::new(),
            waiver: None,
            known: false,
            build: None,
        }
    }
    /// The same, quieter.
    #[must_use]
    pub fn at(mut self, severity: Severity) -> Self {
        self.severity = severity;
        self
    }
}

/// A value used because the file does not state it.
#[derive(Clone, Debug, PartialEq)]
pub struct Assumed {
    /// `load pa-4 minimum`.
    pub key: String,
    /// The value used; `None` where it is no number, and `why` says it in words.
    pub value: Option<Measure>,
    /// Why this one: `80 % of nominal`.
    pub why: &'static str,
    /// The block that could state it.
    pub site: Site,
}

/// A number people want beside a line.
#[derive(Clone, Debug, PartialEq)]
pub struct Derived {
    /// `rail-idle`.
    pub name: &'static str,
    /// Which of several: a load, a region; empty where there is one.
    pub of: String,
    /// The corner it holds at.
    pub corner: Corner,
    /// The number.
    pub value: Measure,
    /// The line it belongs beside.
    pub site: Site,
}

/// Which combination of extremes a derived number holds at.
#[derive(Clone, Copy, Debug, PartialEq, Eq)]
pub struct Corner {
    /// `low`, `nominal` or `high`.
    pub mains: &'static str,
    /// `low` or `high`.
    pub ambient: &'static str,
    /// Channels driven at once.
    pub channels_driven: u32,
    /// `idle`, `duty` or `full`.
    pub drive: &'static str,
}

/// One build, in one alternate or none, solved.
#[derive(Clone, Debug, PartialEq)]
pub struct BuildReport {
    /// The build's name.
    pub name: String,
    /// The alternate it was solved with.
    pub alternate: Option<String>,
    /// The policy in force.
    pub policy: String,
    /// The duty in force, `1/8`.
    pub duty: String,
    /// The build's header.
    pub site: Site,
    /// The coupled solution converged.
    pub settled: bool,
    /// Values used because nothing states them.
    pub assumed: Vec<Assumed>,
    /// Derived numbers.
    pub derived: Vec<Derived>,
    /// Every margin, in rule order.
    pub margins: Vec<Margin>,
    /// The points of the pictures, filled on request.
    pub curves: Option<Vec<Picture>>,
}

/// What became of a waiver.
#[derive(Clone, Copy, Debug, PartialEq, Eq)]
pub enum WaiverState {
    /// It accepts at least one finding.
    Honoured,
    /// It has no reason, or names an unknown rule: it accepts nothing.
    Refused,
    /// It matches nothing any more.
    Stale,
    /// Its date has passed.
    Expired,
}

/// One waiver statement.
#[derive(Clone, Debug, PartialEq, Eq)]
pub struct Waiver {
    /// The rule it names.
    pub rule: String,
    /// The part, if limited to one.
    pub part: Option<String>,
    /// The build, if limited to one.
    pub build: Option<String>,
    /// The alternate, if limited to one.
    pub alternate: Option<String>,
    /// Why.
    pub reason: String,
    /// Who accepted it.
    pub by: Option<String>,
    /// Until when, `2030-01-01`.
    pub until: Option<String>,
    /// What became of it.
    pub state: WaiverState,
    /// The statement.
    pub site: Site,
}

/// One line of a policy.
#[derive(Clone, Debug, PartialEq)]
pub struct PolicyEntry {
    /// The rule.
    pub rule: &'static str,
    /// Its allowance.
    pub allowance: Measure,
    /// Severity of a margin outside its rating.
    pub severity: Severity,
    /// Where the figure comes from.
    pub source: &'static str,
    /// The line that overrides the built-in figure.
    pub site: Option<Site>,
}

/// A policy in force.
#[derive(Clone, Debug, PartialEq)]
pub struct PolicyReport {
    /// Its name.
    pub name: String,
    /// The policy it starts from.
    pub from: Option<String>,
    /// Every rule's entry.
    pub entries: Vec<PolicyEntry>,
}

/// Everything found in one root file and what it uses.
#[derive(Clone, Debug, PartialEq, Default)]
pub struct Report {
    /// Findings about text and data, in file order.
    pub findings: Vec<Finding>,
    /// Each build, each alternate.
    pub builds: Vec<BuildReport>,
    /// The policies in force.
    pub policies: Vec<PolicyReport>,
    /// Every waiver and its state.
    pub waivers: Vec<Waiver>,
}
