//! The JSON report, version 1, as types. The schema is generated from them.
//! Must not know how they are filled.
//!
//! Fields stand in alphabetical order, so that keys are written in that order.

use schemars::JsonSchema;
use serde::{Serialize, Serializer};

/// A number of nine significant digits; never NaN, never infinite.
#[derive(Clone, Copy, Debug, JsonSchema)]
#[schemars(transparent)]
pub struct Number(pub f64);

impl Serialize for Number {
    fn serialize<S: Serializer>(&self, to: S) -> Result<S::Ok, S::Error> {
        let rounded: f64 = format!("{:.8e}", self.0).parse().unwrap_or(0.0);
        // minus nought is nought
        to.serialize_f64(if rounded == 0.0 { 0.0 } else { rounded })
    }
}

/// A report form: every key always there, none beside them.
macro_rules! form {
    ($($(#[$about:meta])* $name:ident { $($(#[$field_about:meta])* $field:ident: $type:ty,)* })*) => {$(
        $(#[$about])*
        #[derive(Debug, Serialize, JsonSchema)]
        #[schemars(deny_unknown_fields)]
        pub struct $name {
            $($(#[$field_about])* pub $field: $type,)*
        }
    )*};
}

/// Words of a closed list.
macro_rules! words {
    ($($(#[$about:meta])* $name:ident { $($(#[$word_about:meta])* $word:ident,)* })*) => {$(
        $(#[$about])*
        #[derive(Clone, Copy, Debug, PartialEq, Eq, Serialize, JsonSchema)]
        #[serde(rename_all = "snake_case")]
        pub enum $name {
            $($(#[$word_about])* $word,)*
        }
    )*};
}

pub mod compare;
pub mod parts;

words! {
    /// How loud.
    Level {
        /// Past a rating, or text that could not be understood.
        Error,
        /// Between allowance and rating.
        Warning,
        /// Never fails a run unless asked to.
        Information,
    }
    /// The outcome of one comparison.
    Verdict {
        /// Stress at or below the allowance.
        Ok,
        /// Stress between allowance and rating.
        Thin,
        /// Stress past the rating.
        Over,
        /// An input is missing, or the data end before the stress.
        Unchecked,
    }
    /// What became of a waiver.
    State {
        /// It accepts at least one finding.
        Honoured,
        /// No reason, or no such rule: it accepts nothing.
        Refused,
        /// It matches nothing any more.
        Stale,
        /// Its date has passed.
        Expired,
    }
}

/// What a command may write.
#[derive(Debug, Serialize, JsonSchema)]
#[serde(untagged)]
pub enum Document {
    /// `check` and `margins`.
    Report(Box<Report>),
    /// `compare`.
    Comparison(Box<compare::Comparison>),
    /// `parts`.
    Parts(Box<parts::Parts>),
}

form! {
    /// The report of one run.
    Report {
        /// The version of this form: 1.
        ampspec_report: u32,
        /// Entries of the baseline that match nothing any more.
        baseline_stale: Vec<Stale>,
        /// Each build, each alternate.
        builds: Vec<Build>,
        /// The command that was run.
        command: String,
        /// 0 or 1.
        exit_status: u8,
        /// From where on the run fails.
        fail_on: String,
        /// Every file read.
        files: Vec<File>,
        /// The policies in force.
        policies: Vec<Policy>,
        /// Where the schema of this form is.
        schema: String,
        /// What each build needs; null but for `derate size`.
        size: Option<Size>,
        /// The builds over random kits; null but for `derate spread`.
        spread: Option<Spread>,
        /// What was counted.
        summary: Summary,
        /// What made this.
        tool: Tool,
        /// Every waiver and its state.
        waivers: Vec<Waiver>,
    }
    /// What made a report.
    Tool {
        /// Its name.
        name: String,
        /// Its version.
        version: String,
    }
    /// What was counted. Severities count what is not waived; verdicts count every margin.
    Summary {
        /// Values used because nothing states them, each once a file.
        assumed: usize,
        /// Findings and margins at error.
        error: usize,
        /// Findings and margins at information, and missing keys.
        information: usize,
        /// Findings and margins that the baseline holds.
        known: usize,
        /// Margins within their allowance.
        ok: usize,
        /// Margins past their rating.
        over: usize,
        /// Margins between allowance and rating.
        thin: usize,
        /// Margins that could not be checked.
        unchecked: usize,
        /// Findings and margins that a waiver accepts.
        waived: usize,
        /// Findings and margins at warning.
        warning: usize,
    }
    /// An entry of the baseline that matches nothing any more.
    Stale {
        /// What it was about.
        about: String,
        /// The spec that was checked.
        file: String,
        /// Of the finding.
        fingerprint: String,
        /// The rule.
        rule: String,
    }
    /// One file.
    File {
        /// What is wrong in it, and which keys margins wait for.
        findings: Vec<Finding>,
        /// Relative, with `/`.
        path: String,
        /// Of the text as it was read.
        sha256: String,
        /// The files it names with `use`.
        uses: Vec<String>,
    }
    /// A policy in force.
    Policy {
        /// Every rule's line.
        entries: Vec<Entry>,
        /// The policy it starts from.
        from: Option<String>,
        /// Its name.
        name: String,
    }
    /// One line of a policy.
    Entry {
        /// What it allows.
        allowance: Qty,
        /// The rule.
        rule: String,
        /// How loud a margin outside its rating is.
        severity: Level,
        /// Where the figure comes from.
        source: Option<String>,
        /// The line that overrides the built-in figure.
        span: Option<Span>,
    }
    /// One build, in one alternate or none.
    Build {
        /// The alternate it was solved with.
        alternate: Option<String>,
        /// Values used because nothing states them.
        assumed: Vec<Assumed>,
        /// The points of the pictures; null where they were not asked for.
        curves: Option<Vec<Picture>>,
        /// Numbers people want beside a line.
        derived: Vec<Derived>,
        /// The duty in force.
        duty: String,
        /// Every margin.
        margins: Vec<Margin>,
        /// Its name.
        name: String,
        /// The file it stands in.
        path: String,
        /// The policy in force.
        policy: String,
        /// The coupled solution converged.
        settled: bool,
        /// Its header.
        span: Span,
    }
    /// A value used because nothing states it.
    Assumed {
        /// What it is.
        key: String,
        /// The value used; null where it is no number.
        value: Option<Qty>,
        /// Why this one.
        why: String,
    }
    /// A picture as numbers.
    Picture {
        /// Figures for the words under it.
        facts: Vec<Fact>,
        /// `safe_area`, `limiter`, `impedance`, `rail`, `ripple`, `heat` or `ladder`.
        kind: String,
        /// Of which parts or load.
        of: Vec<String>,
        /// One above the other, the same axis across.
        panels: Vec<Panel>,
        /// The mains region.
        region: Option<String>,
    }
    /// A figure that holds for a picture.
    Fact {
        /// What it is.
        name: String,
        /// The load it holds for.
        of: Option<String>,
        /// The figure.
        value: Qty,
    }
    /// One pair of axes.
    Panel {
        /// In the order in which they are drawn.
        lines: Vec<Line>,
        /// Points pointed out.
        marks: Vec<Mark>,
        /// Across.
        x: Axis,
        /// Up.
        y: Axis,
    }
    /// One axis.
    Axis {
        /// Logarithmic.
        log: bool,
        /// What it counts.
        name: String,
        /// Its unit.
        unit: String,
    }
    /// A line through points, straight between them in the scales of the axes.
    Line {
        /// Which one: a load, a mains level.
        label: String,
        /// Pairs across and up.
        points: Vec<[Number; 2]>,
        /// `stated`, `derated`, `allowed`, `locus`, `limit`, `plain` or `beside`.
        role: String,
    }
    /// A point pointed out.
    Mark {
        /// Which one.
        label: String,
        /// `worst`, `point`, `allowed` or `rating`.
        role: String,
        /// A figure that belongs to it.
        value: Option<Qty>,
        /// Across.
        x: Number,
        /// Up.
        y: Number,
    }
    /// What the builds of a file need.
    Size {
        /// The table that a seller publishes; empty where every build states its supply.
        cells: Vec<Cell>,
        /// Margins past their allowance whatever the size.
        elsewhere: Vec<Elsewhere>,
        /// What to paste into a build that states no supply.
        pasted: Vec<Pasted>,
        /// One for each build and thing.
        rows: Vec<SizeRow>,
    }
    /// One thing that a build needs.
    SizeRow {
        /// The build.
        build: String,
        /// The thing.
        item: String,
        /// The margin that keeps the next smaller value, or every value, from passing.
        limited: Option<LimitedBy>,
        /// The margins that the choice moves, worst first.
        margins: Vec<Left>,
        /// The least figure that passes.
        needed: Option<Qty>,
        /// The smallest usual value that passes; null where none does.
        offered: Option<String>,
        /// What the file says now.
        stated: Option<String>,
        /// As lines of the language.
        statements: Vec<String>,
    }
    /// Which margin stands in the way, and of which value.
    LimitedBy {
        /// The margin.
        margin: Left,
        /// The value that it keeps from passing.
        value: String,
    }
    /// A margin as a choice leaves it.
    Left {
        /// Which.
        id: String,
        /// Share of the allowance, per cent.
        used_percent: Option<Number>,
        /// Its verdict.
        verdict: Verdict,
    }
    /// A margin that is no matter of size.
    Elsewhere {
        /// The build.
        build: String,
        /// The margin.
        margin: Left,
    }
    /// Text for a build.
    Pasted {
        /// The build.
        build: String,
        /// Blocks, then the lines of the build.
        text: String,
    }
    /// One use of the board.
    Cell {
        /// `allowed`, `condition` or `not`.
        answer: String,
        /// Amplifier channels.
        channels: u32,
        /// The load.
        load: String,
        /// The mains, as the file words it.
        mains: String,
        /// What it takes, the condition, or the reason.
        words: String,
    }
    /// Builds over random kits.
    Spread {
        /// Each build.
        builds: Vec<SpreadBuild>,
        /// The shares of kits, per cent, at which used is given.
        percentiles: Vec<Number>,
        /// What drew the kits.
        seed: u64,
    }
    /// One build over random kits.
    SpreadBuild {
        /// Its name.
        build: String,
        /// Lines that were drawn.
        inputs: Vec<String>,
        /// Kits drawn.
        kits: u32,
        /// Margins that some tolerance moves, the greatest used first.
        margins: Vec<SpreadMargin>,
        /// Whether a model stood for the kits that were not solved in full.
        modelled: bool,
        /// Share of kits within every allowance.
        pass: Number,
        /// Kits solved in full for their verdict.
        solved: u32,
        /// Share of kits within every rating.
        within_ratings: Number,
    }
    /// One margin over random kits.
    SpreadMargin {
        /// The line that moves it most.
        by: Option<String>,
        /// That line's share of the variance that single lines make.
        by_share: Option<Number>,
        /// The worst case says no, and most kits say yes.
        disagrees: bool,
        /// Greatest error of the model found, points of used.
        error: Number,
        /// Share of kits in which it is the governing margin.
        governs: Number,
        /// Which.
        id: String,
        /// Share of kits past its allowance.
        past_allowance: Number,
        /// Share of kits past its rating.
        past_rating: Number,
        /// Used at each of the shares, per cent.
        used_percent: Vec<Number>,
        /// Used in the worst case of every check, per cent.
        worst_case_percent: Number,
        /// The verdict of that.
        worst_case_verdict: Verdict,
    }
    /// A derived number.
    Derived {
        /// What it holds at.
        corner: Corner,
        /// Its name.
        name: String,
        /// Which of several: a load, a region.
        of: Option<String>,
        /// The line it belongs beside.
        span: Span,
        /// The number.
        value: Qty,
    }
    /// A combination of extremes.
    Corner {
        /// `low` or `high`.
        ambient: String,
        /// Driven at once.
        channels_driven: u32,
        /// `idle`, `duty` or `full`.
        drive: String,
        /// `low`, `nominal` or `high`.
        mains: String,
    }
    /// A value and its unit.
    Qty {
        /// As the language spells it.
        unit: String,
        /// In that unit.
        value: Number,
    }
    /// A stretch of a file; the end is exclusive.
    Span {
        /// One past the last character.
        end: Place,
        /// The file.
        path: String,
        /// The first character.
        start: Place,
    }
    /// A place in a file.
    Place {
        /// From 0.
        byte: usize,
        /// In characters, from 1.
        column: usize,
        /// From 1.
        line: usize,
    }
    /// One comparison of one part in one build.
    Margin {
        /// What the policy allows.
        allowance: Option<Qty>,
        /// Changes that were re-solved and clear it.
        changes: Vec<Change>,
        /// Stays when lines move.
        fingerprint: String,
        /// `build/alternate/block.key/rule`.
        id: String,
        /// The baseline holds it.
        known: bool,
        /// 100 - used, points.
        margin_percent: Option<Number>,
        /// The missing keys.
        needs: Vec<String>,
        /// Why it is unchecked, or what kind of over it is.
        note: Option<String>,
        /// What it is about.
        part: Part,
        /// What the data sheet, or the policy's hard limit, allows.
        rating: Option<Qty>,
        /// The other lines that take part.
        related: Vec<Related>,
        /// The rule.
        rule: String,
        /// After policy.
        severity: Level,
        /// The line to blame.
        span: Span,
        /// What the part sees.
        stress: Option<Qty>,
        /// Share of the allowance, per cent; null where unchecked or where no rating is left.
        used_percent: Option<Number>,
        /// Before any waiver.
        verdict: Verdict,
        /// What accepts it.
        waiver: Option<Accepted>,
        /// The worst operating point.
        witness: Witness,
        /// How the numbers were had.
        working: Vec<Step>,
    }
    /// A declared part.
    Part {
        /// The block whose line fixes its use.
        block: String,
        /// The key of that line.
        key: String,
        /// Its name.
        name: String,
        /// Where stated.
        order_code: Option<String>,
        /// `upper` or `lower`.
        polarity: Option<String>,
        /// How many the build holds.
        quantity: Option<u32>,
        /// Designators.
        refs: Vec<String>,
    }
    /// The operating point at which a stress is worst.
    Witness {
        /// Points that tie with it.
        also_at: Vec<String>,
        /// degC.
        ambient_c: Option<Number>,
        /// Peak of the output voltage.
        amplitude_v: Option<Number>,
        /// Of the signal at the worst instant, degrees.
        angle_deg: Option<Number>,
        /// Through the bank.
        bank_a: Option<Number>,
        /// degC.
        case_c: Option<Number>,
        /// Driven at once.
        channels_driven: Option<u32>,
        /// The safe-area curve.
        curve: Option<String>,
        /// Through the device.
        device_a: Option<Number>,
        /// Across the device.
        device_v: Option<Number>,
        /// In force.
        duty: Option<String>,
        /// Signal frequency.
        frequency_hz: Option<Number>,
        /// degC.
        junction_c: Option<Number>,
        /// Its name.
        load: Option<String>,
        /// Mains frequency.
        mains_hz: Option<Number>,
        /// r.m.s.
        mains_v: Option<Number>,
        /// Into the load.
        power_w: Option<Number>,
        /// To ground.
        rail_v: Option<Number>,
        /// degC.
        sink_c: Option<Number>,
        /// Parts taken at an end of their tolerance: `low` or `high`.
        tolerance: std::collections::BTreeMap<String, String>,
    }
    /// One line of the working.
    Step {
        /// How it is had; null for a stated value.
        expression: Option<String>,
        /// The lines it was read from.
        from: Vec<Span>,
        /// In words.
        meaning: String,
        /// Published source of the expression.
        source: Option<String>,
        /// In the formula.
        symbol: String,
        /// Of the value.
        unit: String,
        /// The number.
        value: Number,
    }
    /// A further place that led to a finding.
    Related {
        /// What it contributed.
        message: String,
        /// Where.
        span: Span,
    }
    /// A change that was re-solved and clears the margin it is offered for.
    Change {
        /// What else moves by more than a point.
        also_moves: Vec<Moves>,
        /// As replacements of text.
        edits: Vec<Edit>,
        /// As lines of the language.
        statements: Vec<String>,
        /// In words.
        title: String,
        /// Share of the allowance after it, per cent.
        used_percent_after: Number,
    }
    /// Another margin that a change moves.
    Moves {
        /// Which.
        id: String,
        /// Share of its allowance after.
        used_percent_after: Number,
        /// Share of its allowance before.
        used_percent_before: Number,
    }
    /// A replacement of text.
    Edit {
        /// What is replaced.
        span: Span,
        /// By what.
        text: String,
    }
    /// What is wrong with text or data.
    Finding {
        /// Replacements that would settle it, one alternative each.
        edits: Vec<Edit>,
        /// Stays when lines move.
        fingerprint: String,
        /// What to do.
        hint: Option<String>,
        /// `rule/` and a number that tells apart findings of one rule in this file.
        id: String,
        /// The baseline holds it.
        known: bool,
        /// What is wrong.
        message: String,
        /// How an ambiguous text could be read.
        readings: Vec<Reading>,
        /// The other places.
        related: Vec<Related>,
        /// The rule.
        rule: String,
        /// How loud.
        severity: Level,
        /// Where.
        span: Span,
        /// What accepts it.
        waiver: Option<Accepted>,
    }
    /// One reading of an ambiguous text.
    Reading {
        /// What it would mean.
        means: String,
        /// The text.
        text: String,
    }
    /// What accepts a finding.
    Accepted {
        /// Who.
        by: Option<String>,
        /// Why.
        reason: String,
        /// Until when.
        until: Option<String>,
    }
    /// A waiver statement.
    Waiver {
        /// Limited to this alternate.
        alternate: Option<String>,
        /// Limited to this build.
        build: Option<String>,
        /// Who.
        by: Option<String>,
        /// Limited to this part.
        part: Option<String>,
        /// Why.
        reason: String,
        /// The rule it names.
        rule: String,
        /// The statement.
        span: Span,
        /// What became of it.
        state: State,
        /// Until when.
        until: Option<String>,
    }
}
