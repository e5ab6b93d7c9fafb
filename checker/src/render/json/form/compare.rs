//! The JSON of `derate compare` as types.
//! Must not know how they are filled.

use schemars::JsonSchema;
use serde::Serialize;

use super::{Level, Number, Part, Qty, Tool, Verdict};

words! {
    /// What became of it.
    Change {
        /// Only the later check has it.
        New,
        /// Only the earlier check had it.
        Gone,
        /// It differs.
        Moved,
        /// It does not differ.
        Same,
    }
    /// Which way it went.
    Course {
        /// Less is left, or it can no longer be checked.
        Worse,
        /// Neither.
        Level,
        /// More is left.
        Better,
    }
}

form! {
    /// What moved between two checks.
    Comparison {
        /// The version of this form: 1.
        ampspec_report: u32,
        /// `compare`.
        command: String,
        /// 0 or 1.
        exit_status: u8,
        /// From where on what got worse fails the run.
        fail_on: String,
        /// A figure has moved when it differs by more than this share of itself, per cent.
        figure_threshold_percent: Number,
        /// Operating figures that moved.
        figures: Vec<Figure>,
        /// Findings about text and data that are new or gone.
        findings: Vec<Said>,
        /// The later check.
        new: Checked,
        /// The earlier check.
        old: Checked,
        /// Margins that moved, what got worse first.
        rows: Vec<Row>,
        /// Where the schema of this form is.
        schema: String,
        /// What was counted.
        summary: Tally,
        /// A margin has moved when its verdict differs, or its share by more than this, points.
        threshold_points: Number,
        /// What made this.
        tool: Tool,
    }
    /// One of the two.
    Checked {
        /// The file, or `revision:file`.
        path: String,
        /// Of the text as it was read.
        sha256: String,
    }
    /// How many margins went which way.
    Tally {
        /// Got better.
        better: usize,
        /// Of the worse, now an error; new errors of text and data counted.
        error: usize,
        /// Only in the earlier.
        gone: usize,
        /// Only in the later.
        new: usize,
        /// Alike.
        same: usize,
        /// Of the worse, no longer checked.
        unchecked: usize,
        /// Of the worse, now a warning; new warnings of text and data counted.
        warning: usize,
        /// Got worse.
        worse: usize,
    }
    /// One margin in both checks.
    Row {
        /// In the later check; null where gone.
        after: Option<Held>,
        /// In the earlier check; null where new.
        before: Option<Held>,
        /// Which way it went.
        course: Course,
        /// Of the later margin, else of the earlier.
        id: String,
        /// The rule.
        rule: String,
        /// What became of it.
        state: Change,
    }
    /// A margin in one check.
    Held {
        /// What the policy allows.
        allowance: Option<Qty>,
        /// What it is about.
        part: Part,
        /// What the data sheet, or the policy's hard limit, allows.
        rating: Option<Qty>,
        /// After policy.
        severity: Level,
        /// What the part sees.
        stress: Option<Qty>,
        /// Share of the allowance, per cent.
        used_percent: Option<Number>,
        /// Before any waiver.
        verdict: Verdict,
        /// A waiver accepts it.
        waived: bool,
    }
    /// One operating figure in both checks.
    Figure {
        /// In the later check.
        after: Option<Qty>,
        /// In the earlier check.
        before: Option<Qty>,
        /// The build, with its alternate.
        build: String,
        /// `low`, `nominal` or `high`.
        mains: String,
        /// Its name.
        name: String,
        /// Which of several.
        of: Option<String>,
        /// What became of it.
        state: Change,
    }
    /// A finding in one check only.
    Said {
        /// What is wrong.
        message: String,
        /// The rule.
        rule: String,
        /// How loud.
        severity: Level,
        /// New or gone.
        state: Change,
        /// A waiver accepts it.
        waived: bool,
    }
}
