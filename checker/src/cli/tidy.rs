//! `derate tidy`. Must not know what the canonical layout is.

use std::fs;
use std::io::IsTerminal;
use std::path::PathBuf;

use derate::render::escape;
use similar::TextDiff;

use super::input::{Input, inputs};
use super::{Done, NOT_RUN, save};

#[derive(clap::Args)]
pub(crate) struct Args {
    /// Files, folders, or - for standard input to standard output [default: the folder one is in]
    paths: Vec<PathBuf>,
    /// Write nothing; print what would change, and exit with 1 if anything would
    #[arg(long)]
    diff: bool,
}

impl Args {
    pub(crate) fn run(self) -> Done {
        let (files, notes) = inputs(&self.paths);
        let mut done = Done { status: if notes.is_empty() { 0 } else { NOT_RUN }, notes, ..Done::default() };
        for file in &files {
            match tidied(file) {
                Ok((before, after)) => self.put(file, &before, &after, &mut done),
                Err((status, why)) => {
                    done.notes.push(format!("{}: {why}", file.name));
                    done.status = done.status.max(status);
                }
            }
        }
        done
    }

    fn put(&self, file: &Input, before: &str, after: &str, done: &mut Done) {
        if self.diff && before != after {
            done.output.push_str(&difference(&file.name, before, after));
            done.status = done.status.max(1);
        } else if file.is_stdin() && !self.diff {
            done.output.push_str(after);
        } else if before != after
            && let Err(error) = save::replace(&file.path, after)
        {
            done.notes.push(format!("cannot write {}: {error}", file.name));
            done.status = NOT_RUN;
        }
    }
}

/// The text before and after, or the exit status and why it is left as it is.
fn tidied(file: &Input) -> Result<(String, String), (u8, String)> {
    let before = if file.is_stdin() {
        file.read().map_err(|why| (NOT_RUN, why))?.to_string()
    } else {
        // bytes that are no text must not be written back as something else
        fs::read_to_string(&file.path).map_err(|error| (NOT_RUN, format!("cannot read: {error}")))?
    };
    let after = derate::tidy::tidy(&before).map_err(|why| (1, format!("left as it is: {why}")))?;
    Ok((before, after))
}

/// What would change, as a patch; harmless where a terminal shows it.
fn difference(name: &str, before: &str, after: &str) -> String {
    let patch = TextDiff::from_lines(before, after).unified_diff().header(name, name).to_string();
    if std::io::stdout().is_terminal() { escape::source(&patch).into_owned() } else { patch }
}
