//! `derate size`. Must not know how a form is written.

use std::path::PathBuf;

use clap::ValueEnum;
use derate::render::{json, size};

use super::solve::Solve;
use super::{Done, NOT_RUN};

#[derive(clap::Args)]
pub(crate) struct Args {
    /// A file, or - for standard input
    path: PathBuf,
    /// How to report
    #[arg(long, value_enum, default_value_t)]
    form: Form,
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
    /// For a page or a comment
    Markdown,
}

impl Args {
    pub(crate) fn run(self) -> Done {
        let sized = self.solve.one(&self.path, |files, path, name, options| {
            derate::size::size(files, path, name, options)
        });
        let sized = match sized {
            Ok(sized) => sized,
            Err(note) => return Done::refused(note),
        };
        let (run, notes, _) = self.solve.run("size", &[self.path], |o| o.changes = false);
        let none = sized.rows.iter().any(|r| r.offered.is_none());
        let status = if notes.is_empty() { u8::from(none) } else { NOT_RUN };
        let output = match self.form {
            Form::Terminal => size::terminal(&sized, self.solve.style()),
            Form::Json => json::sized(&run, &sized, status),
            Form::Markdown => size::markdown(&sized),
        };
        Done { output, file: self.solve.out, notes, status }
    }
}
