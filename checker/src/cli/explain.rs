//! `derate explain`. Must not know any particular rule.

use std::path::PathBuf;

use clap::ValueEnum;
use derate::render::explain;
use derate::rules;
use derate::vocabulary::nearest;

use super::{Colour, Done};

#[derive(clap::Args)]
pub(crate) struct Args {
    /// A rule, such as soa.reactive [default: a list of all]
    rule: Option<String>,
    /// How to print
    #[arg(long, value_enum, default_value_t)]
    form: Form,
    /// Write to this file instead of standard output
    #[arg(long, value_name = "FILE")]
    out: Option<PathBuf>,
}

#[derive(Clone, Copy, Default, ValueEnum)]
enum Form {
    /// For people
    #[default]
    Terminal,
    /// For programs
    Json,
    /// For a page
    Markdown,
}

impl Args {
    pub(crate) fn run(self) -> Done {
        let output = match &self.rule {
            None => match self.form {
                Form::Terminal => explain::terminal_list(),
                Form::Json => explain::json(rules::all()),
                Form::Markdown => explain::markdown_list(),
            },
            Some(name) => {
                let Some(rule) = rules::find(name) else { return Done::refused(unknown(name)) };
                match self.form {
                    Form::Terminal => explain::terminal(rule, Colour::Never.style(self.out.is_some()).width),
                    Form::Json => explain::json(std::iter::once(rule)),
                    Form::Markdown => explain::markdown(rule),
                }
            }
        };
        Done::with(output).into_file(self.out)
    }
}

fn unknown(name: &str) -> String {
    let near = nearest(name, rules::all().map(|r| r.name));
    match near.is_empty() {
        true => format!("no rule is named {name}; derate explain lists them"),
        false => format!("no rule is named {name}; did you mean {}?", near.join(" or ")),
    }
}
