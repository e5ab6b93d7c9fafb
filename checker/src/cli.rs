//! The command line: reads arguments, starts one command, and is the one place that prints.
//! Must not know what a command does.

mod apply;
mod input;
mod progress;
mod revision;
mod save;
mod solve;

use std::io::{self, IsTerminal, Write};
use std::path::PathBuf;
use std::process::ExitCode;

use clap::{Parser, ValueEnum};
use derate::render::{escape, terminal::Style};

/// The command line or a file could not be read.
const NOT_RUN: u8 = 2;

/// Lists every command once: its file in this folder, the type of its arguments, its help.
macro_rules! commands {
    ($($(#[$about:meta])* $name:ident($module:ident),)*) => {
        $(mod $module;)*

        #[derive(clap::Subcommand)]
        enum Command {
            $($(#[$about])* $name($module::Args),)*
        }

        impl Command {
            fn run(self) -> Done {
                match self {
                    $(Self::$name(args) => args.run(),)*
                }
            }
        }
    };
}

commands! {
    /// Check ampspec files, or every .ampspec below a folder
    Check(check),
    /// Summarise every margin, by part
    Margins(margins),
    /// Find the smallest usual transformer, reservoir, heatsink and fuses that pass
    Size(size),
    /// Draw random kits within tolerance, and say how many pass
    Spread(spread),
    /// Show which margins moved between two specs, or two revisions of one
    Compare(compare),
    /// Check a bill of materials against a spec, or write one from it
    Parts(parts),
    /// Explain a rule, or list all of them
    Explain(explain),
    /// Put files into the canonical layout; meaning never changes
    Tidy(tidy),
    /// Print the JSON schema of the reports
    Schema(schema),
    /// Print a completion script for a shell
    Completions(completions),
}

/// Design-rule linter for class-AB audio power amplifier specs
#[derive(Parser)]
#[command(name = "derate", version, max_term_width = 100)]
#[command(
    after_help = "Exit status: 0 nothing at or above the fail level, 1 something is, \
2 the command line or a file could not be read."
)]
struct Cli {
    #[command(subcommand)]
    command: Command,
}

/// What a command has to say.
#[derive(Default)]
struct Done {
    /// For standard output, or for the file.
    output: String,
    /// Instead of standard output.
    file: Option<PathBuf>,
    /// For standard error, one a line.
    notes: Vec<String>,
    /// The exit status.
    status: u8,
}

impl Done {
    /// Output and nothing else to say.
    fn with(output: String) -> Self {
        Self {
            output,
            ..Self::default()
        }
    }

    /// The command line asks for something that is not there.
    fn refused(note: impl Into<String>) -> Self {
        Self {
            notes: vec![note.into()],
            status: NOT_RUN,
            ..Self::default()
        }
    }

    /// Output into a file instead.
    fn into_file(self, file: Option<PathBuf>) -> Self {
        Self { file, ..self }
    }
}

/// When to use colour.
#[derive(Clone, Copy, Default, ValueEnum)]
enum Colour {
    /// On a terminal, unless `NO_COLOR` is set
    #[default]
    Auto,
    /// Even into a file
    Always,
    /// Not at all
    Never,
}

impl Colour {
    /// How to draw; `to_file` where the output does not go to standard output.
    fn style(self, to_file: bool) -> Style {
        let plain = Style::default();
        let terminal = !to_file && io::stdout().is_terminal();
        let set = |name: &str| std::env::var_os(name).filter(|value| !value.is_empty());
        let dumb = || set("TERM").is_some_and(|term| term == "dumb");
        let colour = match self {
            Self::Always => true,
            Self::Never => false,
            Self::Auto => terminal && set("NO_COLOR").is_none() && !dumb(),
        };
        let columns = if terminal {
            terminal_size::terminal_size()
        } else {
            None
        };
        // narrower breaks the marks, wider is hard to read
        let width = columns.map_or(plain.width, |(w, _)| usize::from(w.0).clamp(60, 140));
        Style { width, colour }
    }
}

/// Read the command line, run, print, and answer with the exit status.
pub(crate) fn run() -> ExitCode {
    let done = Cli::parse().command.run();
    let mut status = done.status;
    let mut notes = done.notes;
    match &done.file {
        Some(path) => {
            if let Err(error) = save::replace(path, &done.output) {
                notes.push(format!("cannot write {}: {error}", path.display()));
                status = NOT_RUN;
            }
        }
        None => {
            if let Err(error) = io::stdout().lock().write_all(done.output.as_bytes()) {
                // whoever closed the pipe has seen enough
                if error.kind() != io::ErrorKind::BrokenPipe {
                    notes.push(format!("cannot write: {error}"));
                    status = NOT_RUN;
                }
            }
        }
    }
    let mut errors = io::stderr().lock();
    for note in notes {
        // nobody is left to be told that nobody can be told
        let _ = writeln!(errors, "derate: {}", escape::terminal(&note));
    }
    ExitCode::from(status)
}
