//! `derate check`. Must not know how a form is written.

use std::path::{Path, PathBuf};

use clap::ValueEnum;
use derate::baseline::Baseline;
use derate::render::run::Run;
use derate::render::{annotations, json, markdown, sarif, terminal, test_xml};
use derate::source::{Disk, Files};

use super::solve::Solve;
use super::{Done, apply, save};

#[derive(clap::Args)]
pub(crate) struct Args {
    /// Files, folders, or - for standard input [default: the folder one is in]
    paths: Vec<PathBuf>,
    /// How to report
    #[arg(long, value_enum, default_value_t)]
    form: Form,
    /// Fail only on what this file does not hold; what it holds and is gone is named
    #[arg(long, value_name = "FILE")]
    baseline: Option<PathBuf>,
    /// Write what is found into this file, as the baseline of later runs
    #[arg(long, value_name = "FILE", conflicts_with = "baseline")]
    write_baseline: Option<PathBuf>,
    /// Write the change that is proposed for this rule into the file, and print what it moves
    #[arg(long, value_name = "RULE", conflicts_with_all = ["baseline", "write_baseline", "form"])]
    apply: Option<String>,
    /// With --apply: the part, its block or a designator, where the rule is found at several
    #[arg(long, value_name = "PART", requires = "apply")]
    of: Option<String>,
    #[command(flatten)]
    solve: Solve,
}

#[derive(Clone, Copy, Default, ValueEnum)]
enum Form {
    /// For people
    #[default]
    Terminal,
    /// For programs; `derate schema` describes it
    Json,
    /// For code-scanning services
    Sarif,
    /// For a comment on a pull request
    Markdown,
    /// For services that collect test reports
    TestXml,
    /// For services that mark the lines of a change
    Annotations,
}

impl Args {
    pub(crate) fn run(self) -> Done {
        if let Some(rule) = &self.apply {
            return apply::run(&self.solve, &self.paths, rule, self.of.as_deref());
        }
        let (outcomes, mut notes) = self.solve.outcomes(&self.paths);
        let run = match self.held(outcomes) {
            Ok(run) => run,
            Err(note) => return Done::refused(note),
        };
        notes.extend(self.solve.unheeded(&run.outcomes));
        let output = match self.form {
            Form::Terminal => terminal::check(&run, self.solve.style()),
            Form::Json => json::render(&run),
            Form::Sarif => sarif::check(&run),
            Form::Markdown => markdown::check(&run),
            Form::TestXml => test_xml::check(&run),
            Form::Annotations => annotations::check(&run),
        };
        let status = self.solve.status(run.exit_status(), &notes);
        Done { output, file: self.solve.out, notes, status }
    }

    /// The run, with what the baseline holds marked.
    fn held(&self, mut outcomes: Vec<derate::Outcome>) -> Result<Run, String> {
        let mut stale = Vec::new();
        if let Some(baseline) = self.baseline(&outcomes)? {
            stale = baseline.apply(&mut outcomes, |file| Path::new(file).exists());
            if self.solve.picks_a_build() {
                // the other builds were not looked at
                stale.clear();
            }
        }
        let mut run = Run::new("check", self.solve.fail_on(), outcomes);
        run.stale = stale;
        Ok(run)
    }

    /// The baseline in force: read, or just written.
    fn baseline(&self, outcomes: &[derate::Outcome]) -> Result<Option<Baseline>, String> {
        if let Some(path) = &self.write_baseline {
            let baseline = Baseline::of(outcomes);
            save::replace(path, &baseline.text())
                .map_err(|error| format!("cannot write {}: {error}", path.display()))?;
            return Ok(Some(baseline));
        }
        let Some(path) = &self.baseline else {
            return Ok(None);
        };
        let cannot = |why| format!("cannot read {}: {why}", path.display());
        let text = Disk.read(path).map_err(cannot)?;
        Baseline::read(&text).map(Some).map_err(cannot)
    }
}
