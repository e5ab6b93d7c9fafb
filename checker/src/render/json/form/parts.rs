//! The JSON of `derate parts` as types.
//! Must not know how they are filled.

use schemars::JsonSchema;
use serde::Serialize;

use super::{Accepted, Level, Span, Tool, Verdict};

form! {
    /// A bill of materials held against a spec.
    Parts {
        /// The version of this form: 1.
        ampspec_report: u32,
        /// The bill of materials.
        bom: String,
        /// The build it was held against.
        build: String,
        /// `parts`.
        command: String,
        /// 0 or 1.
        exit_status: u8,
        /// From where on the run fails.
        fail_on: String,
        /// What the quantities are for: `build` or `board`.
        per: String,
        /// What is said of the list, the loudest first.
        rows: Vec<Line>,
        /// Where the schema of this form is.
        schema: String,
        /// The spec.
        spec: String,
        /// What was counted.
        summary: PartsCount,
        /// What made this.
        tool: Tool,
    }
    /// What was counted; severities count what is not waived.
    PartsCount {
        /// Rows at error.
        error: usize,
        /// Parts of the spec that the list holds.
        found: usize,
        /// Rows at information.
        information: usize,
        /// Rows of the list that are ordered.
        listed: usize,
        /// Rows about what could not be compared.
        unchecked: usize,
        /// Rows that a waiver accepts.
        waived: usize,
        /// Parts that the spec wants.
        wanted: usize,
        /// Rows at warning.
        warning: usize,
    }
    /// One thing said of the list.
    Line {
        /// What the list says; null where it has no such row.
        bom: Option<String>,
        /// Rule, part and line.
        id: String,
        /// What is wrong.
        message: String,
        /// The part, as a template names it.
        part: String,
        /// Designators.
        refs: Vec<String>,
        /// The line of the list; null where it has no such row.
        row: Option<u64>,
        /// The rule.
        rule: String,
        /// After policy.
        severity: Level,
        /// The line of the spec; null where no line speaks of it.
        span: Option<Span>,
        /// What the spec says.
        spec: Option<String>,
        /// `ok` for what is only worth knowing.
        verdict: Verdict,
        /// What accepts it.
        waiver: Option<Accepted>,
    }
}
