//! `derate spread`. Must not know how a form is written.

use std::io::{IsTerminal, Write};
use std::path::PathBuf;

use clap::ValueEnum;
use derate::render::{json, spread};
use derate::spread::Ask;

use super::solve::Solve;
use super::{Done, NOT_RUN};

/// Steps of the bar.
const STEPS: u64 = 40;

#[derive(clap::Args)]
pub(crate) struct Args {
    /// A file, or - for standard input
    path: PathBuf,
    /// How to report
    #[arg(long, value_enum, default_value_t)]
    form: Form,
    /// How many kits to draw, a million at most
    #[arg(long, value_name = "N", default_value_t = 100_000)]
    builds: u32,
    /// The same seed draws the same kits
    #[arg(long, value_name = "S", default_value_t = 1)]
    seed: u64,
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
        let ask = Ask { kits: self.builds, seed: self.seed };
        let shown = std::io::stderr().is_terminal();
        let drawn = self.solve.one(&self.path, |files, path, name, options| {
            derate::spread::spread(files, path, name, options, ask, &|done, all| {
                if shown {
                    bar(done, all);
                }
            })
        });
        let drawn = match drawn {
            Ok(drawn) => drawn,
            Err(note) => return Done::refused(note),
        };
        let (run, notes, _) = self.solve.run("spread", &[self.path], |o| o.changes = false);
        let (past, over) = (
            drawn.iter().any(|b| b.pass.0 < 1.0),
            drawn.iter().any(|b| b.pass.1 < 1.0),
        );
        let status = if notes.is_empty() { u8::from(self.solve.fails(over, past)) } else { NOT_RUN };
        let output = match self.form {
            Form::Terminal => spread::terminal(&drawn, self.seed, self.solve.style()),
            Form::Json => json::spread(&run, &drawn, self.seed, status),
            Form::Markdown => spread::markdown(&drawn, self.seed),
        };
        Done { output, file: self.solve.out, notes, status }
    }
}

/// How far it has come, on one line of standard error that is wiped at the end.
fn bar(done: u64, all: u64) {
    let full = (done * STEPS / all.max(1)).min(STEPS) as usize;
    let line = format!("\r[{}{}] {done} of {all} kits", "#".repeat(full), ".".repeat(STEPS as usize - full));
    let line = if done >= all { format!("\r{}\r", " ".repeat(line.len())) } else { line };
    let mut to = std::io::stderr().lock();
    // progress that cannot be shown is no reason to stop
    let _ = to.write_all(line.as_bytes()).and_then(|()| to.flush());
}
