//! `derate parts`. Must not know how a form is written, nor how parts are compared.

use std::path::PathBuf;

use clap::ValueEnum;
use derate::bom::{self, Against, Basis, COLUMNS, Column};
use derate::render::{json, parts};
use derate::source::{Disk, Files};

use super::input::{Given, Input, Shelf};
use super::solve::Solve;
use super::Done;

#[derive(clap::Args)]
#[command(group(clap::ArgGroup::new("what").required(true).args(["against", "template"])))]
pub(crate) struct Args {
    /// The spec, or - for standard input
    path: PathBuf,
    /// The bill of materials: comma-separated values with a header
    #[arg(long, value_name = "BOM.csv")]
    against: Option<PathBuf>,
    /// Write the bill of materials that the spec wants
    #[arg(long)]
    template: bool,
    /// What a column holds, where its heading does not say it: refs=Position. The kinds are refs,
    /// quantity, code, value, rating, description, alternates and spec
    #[arg(long, value_name = "KIND=HEADING", value_parser = column)]
    column: Vec<(Column, String)>,
    /// What the quantities are for
    #[arg(long, value_enum, default_value_t)]
    per: Per,
    /// How to report
    #[arg(long, value_enum, default_value_t)]
    form: Form,
    #[command(flatten)]
    solve: Solve,
}

#[derive(Clone, Copy, Default, ValueEnum)]
enum Per {
    /// One build: all its boards, supplies and heatsinks
    #[default]
    Build,
    /// One board
    Board,
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
    /// For a spreadsheet
    Csv,
}

/// `refs=Position`.
fn column(text: &str) -> Result<(Column, String), String> {
    let (kind, heading) = text.split_once('=').ok_or("wants KIND=HEADING")?;
    match COLUMNS.iter().find(|(_, name, _)| *name == kind) {
        Some((column, ..)) => Ok((*column, heading.to_owned())),
        None => {
            let names: Vec<&str> = COLUMNS.iter().map(|(_, name, _)| *name).collect();
            Err(format!("no kind of column is called {kind}; there are {}", names.join(", ")))
        }
    }
}

impl Args {
    pub(crate) fn run(self) -> Done {
        match self.done() {
            Ok((output, status)) => Done {
                output,
                file: self.solve.out,
                notes: Vec::new(),
                status,
            },
            Err(note) => Done::refused(note),
        }
    }

    fn done(&self) -> Result<(String, u8), String> {
        let file = Input::new(self.path.clone());
        let cannot = |why| format!("{}: {why}", file.name);
        let shelf = Shelf::default();
        let given = Given {
            path: &file.path,
            text: file.read().map_err(cannot)?,
            shelf: &shelf,
        };
        let mut options = self.solve.options();
        options.root = file.root();
        let basis = match self.per {
            Per::Build => Basis::Build,
            Per::Board => Basis::Board,
        };
        let Some(list) = &self.against else {
            let text = bom::template(&given, &file.path, &file.name, &options, basis).map_err(cannot)?;
            return Ok((text, 0));
        };
        let list = Input::new(list.clone());
        let text = Disk.read(&list.path).map_err(|why| format!("cannot read {}: {why}", list.name))?;
        let against = Against {
            name: &list.name,
            text: &text,
            columns: &self.column,
            basis,
        };
        let crossed = bom::against(&given, &file.path, &file.name, &options, &against)
            .map_err(|why| if why.starts_with(&list.name) { why } else { cannot(why) })?;
        let fail_on = self.solve.fail_on();
        let status = u8::from(parts::Counts::of(&crossed).fails(fail_on));
        let output = match self.form {
            Form::Terminal => parts::terminal(&crossed, self.solve.style()),
            Form::Json => json::parts::render(&crossed, fail_on, status),
            Form::Markdown => parts::markdown(&crossed),
            Form::Csv => parts::csv(&crossed),
        };
        Ok((output, status))
    }
}
