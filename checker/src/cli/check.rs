//! `derate check`. Must not know how a form is written.

use std::path::PathBuf;

use clap::ValueEnum;
use derate::render::{annotations, json, markdown, sarif, terminal, test_xml};

use super::Done;
use super::solve::Solve;

#[derive(clap::Args)]
pub(crate) struct Args {
    /// Files, folders, or - for standard input [default: the folder one is in]
    paths: Vec<PathBuf>,
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
        let (run, notes, status) = self.solve.run("check", &self.paths, |_| {});
        let output = match self.form {
            Form::Terminal => terminal::check(&run, self.solve.style()),
            Form::Json => json::render(&run),
            Form::Sarif => sarif::check(&run),
            Form::Markdown => markdown::check(&run),
            Form::TestXml => test_xml::check(&run),
            Form::Annotations => annotations::check(&run),
        };
        Done { output, file: self.solve.out, notes, status }
    }
}
