//! `derate compare`. Must not know how a form is written, nor what counts as moved.

use std::path::{Path, PathBuf};

use clap::ValueEnum;
use derate::Outcome;
use derate::compare::{Comparison, POINTS, Weight};
use derate::render::run::FailOn;
use derate::render::{compare, json};

use super::input::{Input, Shelf};
use super::solve::{Solve, outcome};
use super::{Done, revision};

#[derive(clap::Args)]
pub(crate) struct Args {
    /// The earlier spec: a file, or revision:file such as HEAD~1:kit.ampspec
    old: String,
    /// The later spec, named likewise
    new: String,
    /// How to report
    #[arg(long, value_enum, default_value_t)]
    form: Form,
    /// By how many points a share of its allowance must differ to have moved
    #[arg(long, value_name = "N", default_value_t = POINTS, value_parser = points)]
    points: f64,
    /// Show also what did not move
    #[arg(long)]
    all: bool,
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
    /// For a comment on a pull request
    Markdown,
}

/// A number of points, zero or more.
fn points(text: &str) -> Result<f64, String> {
    match text.parse::<f64>() {
        Ok(points) if points.is_finite() && points >= 0.0 => Ok(points),
        _ => Err("a number, zero or more".to_owned()),
    }
}

impl Args {
    pub(crate) fn run(self) -> Done {
        let (old, new) = match (self.one(&self.old), self.one(&self.new)) {
            (Ok(old), Ok(new)) => (old, new),
            (Err(note), _) | (_, Err(note)) => return Done::refused(note),
        };
        let notes = self.solve.unheeded(&[old.clone(), new.clone()]);
        let comparison = Comparison::new(&old, &new, self.points);
        let fail_on = self.solve.fail_on();
        let at = match fail_on {
            FailOn::Error => Weight::Error,
            FailOn::Warning => Weight::Warning,
            FailOn::Unchecked => Weight::Unchecked,
        };
        let failed = u8::from(comparison.counts().fails(at));
        let output = match self.form {
            Form::Terminal => compare::terminal(&comparison, self.all, self.solve.style()),
            Form::Json => json::compare::render(&comparison, self.all, fail_on, failed),
            Form::Markdown => compare::markdown(&comparison, self.all),
        };
        let status = self.solve.status(failed, &notes);
        Done {
            output,
            file: self.solve.out,
            notes,
            status,
        }
    }

    /// One of the two, checked.
    fn one(&self, name: &str) -> Result<Outcome, String> {
        let mut options = self.solve.options();
        let Some((revision, path)) = revision::split(name) else {
            let file = Input::new(PathBuf::from(name));
            return outcome(&file, &Shelf::default(), &options);
        };
        let cannot = |why| format!("cannot read {name}: {why}");
        let found = revision::find(revision, path).map_err(cannot)?;
        options.root = Some(found.root);
        let path: &Path = &found.path;
        derate::check(&found.files, path, name, &options).map_err(cannot)
    }
}
