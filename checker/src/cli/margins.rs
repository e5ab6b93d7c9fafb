//! `derate margins`. Must not know how a form is written.

use std::path::PathBuf;

use clap::ValueEnum;
use derate::render::{csv, html, json, margins, markdown};

use super::Done;
use super::solve::Solve;

#[derive(clap::Args)]
pub(crate) struct Args {
    /// Files, folders, or - for standard input
    #[arg(required = true)]
    paths: Vec<PathBuf>,
    /// How to report
    #[arg(long, value_enum, default_value_t)]
    form: Form,
    /// In JSON, also the points of the pictures that the HTML draws
    #[arg(long)]
    curves: bool,
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
    /// For a browser
    Html,
    /// For a spreadsheet
    Csv,
}

impl Args {
    pub(crate) fn run(self) -> Done {
        let drawn = self.curves || matches!(self.form, Form::Html);
        let (run, notes, status) = self.solve.run("margins", &self.paths, |options| {
            options.curves = drawn;
        });
        let output = match self.form {
            Form::Terminal => margins::terminal(&run, self.solve.style()),
            Form::Json => json::render(&run),
            Form::Markdown => markdown::margins(&run),
            Form::Html => html::margins(&run),
            Form::Csv => csv::margins(&run),
        };
        Done { output, file: self.solve.out, notes, status }
    }
}
