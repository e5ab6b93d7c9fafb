//! What the commands that solve builds have in common: their options, and the run.
//! Must not know how a run is printed.

use std::path::{Path, PathBuf};

use clap::ValueEnum;
use derate::render::run::{FailOn, Run};
use derate::render::terminal::Style;
use derate::source::Files;
use derate::today::today;
use derate::{Options, Outcome};
use rayon::prelude::*;

use super::input::{Given, Input, Shelf, inputs};
use super::progress::Progress;
use super::{Colour, NOT_RUN};

/// Options of every command that solves builds.
#[derive(clap::Args)]
pub(crate) struct Solve {
    /// Write the report to this file instead of standard output
    #[arg(long, value_name = "FILE")]
    pub(crate) out: Option<PathBuf>,
    /// Only the build of this name
    #[arg(long, value_name = "NAME")]
    build: Option<String>,
    /// Use this policy in place of the one that each build names
    #[arg(long, value_name = "NAME")]
    policy: Option<String>,
    /// From where on the exit status is 1
    #[arg(long, value_enum, default_value_t, value_name = "LEVEL")]
    fail_on: Level,
    /// When to use colour
    #[arg(
        long,
        alias = "color",
        value_enum,
        default_value_t,
        value_name = "WHEN"
    )]
    colour: Colour,
    /// How many files to check at once [default: one for each processor]
    #[arg(long, value_name = "N")]
    threads: Option<usize>,
}

/// From where on a run fails.
#[derive(Clone, Copy, Default, ValueEnum)]
enum Level {
    /// Errors
    #[default]
    Error,
    /// Errors and warnings
    Warning,
    /// Errors, warnings, and margins that could not be checked
    Unchecked,
}

impl Solve {
    /// How to draw in a terminal.
    pub(crate) fn style(&self) -> Style {
        self.colour.style(self.out.is_some())
    }

    /// Solve every file named; also what to say on standard error, and the exit status. `ask` adds
    /// what a form shows beyond the verdicts and changes.
    pub(crate) fn run(
        &self,
        command: &'static str,
        paths: &[PathBuf],
        ask: impl FnOnce(&mut Options),
    ) -> (Run, Vec<String>, u8) {
        let mut options = self.with_changes();
        ask(&mut options);
        let (outcomes, mut notes) = self.solved(paths, &options);
        notes.extend(self.unheeded(&outcomes));
        let run = Run::new(command, self.fail_on(), outcomes);
        let status = self.status(run.exit_status(), &notes);
        (run, notes, status)
    }

    /// Every file named, solved, with the changes that would clear what is found; also what to say on
    /// standard error.
    pub(crate) fn outcomes(&self, paths: &[PathBuf]) -> (Vec<Outcome>, Vec<String>) {
        self.solved(paths, &self.with_changes())
    }

    fn with_changes(&self) -> Options {
        Options {
            changes: true,
            ..self.options()
        }
    }

    fn solved(&self, paths: &[PathBuf], options: &Options) -> (Vec<Outcome>, Vec<String>) {
        let (files, mut notes) = inputs(paths);
        let shelf = Shelf::default();
        let results = self.each(&files, |file| outcome(file, &shelf, options));
        let mut outcomes = Vec::with_capacity(results.len());
        for result in results {
            match result {
                Ok(outcome) => outcomes.push(outcome),
                Err(note) => notes.push(note),
            }
        }
        (outcomes, notes)
    }

    /// Whether only one build is looked at.
    pub(crate) fn picks_a_build(&self) -> bool {
        self.build.is_some()
    }

    /// How to check, without looking for changes.
    pub(crate) fn options(&self) -> Options {
        Options {
            policy: self.policy.clone(),
            build: self.build.clone(),
            today: today(),
            ..Options::default()
        }
    }

    /// From where on the run fails.
    pub(crate) fn fail_on(&self) -> FailOn {
        match self.fail_on {
            Level::Error => FailOn::Error,
            Level::Warning => FailOn::Warning,
            Level::Unchecked => FailOn::Unchecked,
        }
    }

    /// The exit status: what was found, unless something could not be done.
    pub(crate) fn status(&self, found: u8, notes: &[String]) -> u8 {
        if notes.is_empty() { found } else { NOT_RUN }
    }

    /// Do something else with one file than check it, on as many threads as were asked for.
    ///
    /// # Errors
    /// When it is no one file, or cannot be read; the text says why.
    pub(crate) fn one<T: Send>(
        &self,
        path: &Path,
        work: impl FnOnce(&dyn Files, &Path, &str, &Options) -> Result<T, String> + Send,
    ) -> Result<T, String> {
        let (files, notes) = inputs(&[path.to_owned()]);
        let [file] = files.as_slice() else {
            let why = notes.first().map_or("it is not one file", String::as_str);
            return Err(format!("cannot read {}: {why}", path.display()));
        };
        let cannot = |why| format!("cannot read {}: {why}", file.name);
        let text = file.read().map_err(cannot)?;
        let options = Options {
            root: file.root(),
            ..self.options()
        };
        let run = || {
            let shelf = Shelf::default();
            let path = file.path.as_path();
            let given = Given {
                path,
                text,
                shelf: &shelf,
            };
            work(&given, path, &file.name, &options).map_err(cannot)
        };
        match rayon::ThreadPoolBuilder::new()
            .num_threads(self.threads.unwrap_or(0))
            .build()
        {
            Ok(pool) => pool.install(run),
            Err(_) => run(),
        }
    }

    /// Whether errors or warnings fail the run.
    pub(crate) fn fails(&self, errors: bool, warnings: bool) -> bool {
        match self.fail_on {
            Level::Error => errors,
            Level::Warning | Level::Unchecked => errors || warnings,
        }
    }

    /// Names on the command line that name nothing.
    pub(crate) fn unheeded(&self, outcomes: &[Outcome]) -> Vec<String> {
        let mut notes = Vec::new();
        let builds = || outcomes.iter().flat_map(|o| &o.report.builds);
        if let Some(name) = &self.build
            && !outcomes.is_empty()
            && builds().next().is_none()
        {
            notes.push(format!("no build is named {name}"));
        }
        if let Some(name) = &self.policy
            && let Some(build) = builds().find(|b| b.policy != *name)
        {
            notes.push(format!(
                "no policy is named {name}; build {} was checked under {}",
                build.name, build.policy
            ));
        }
        notes
    }

    /// One result for each file, in the order of the files, whatever the number of threads. A pool
    /// costs more to start than a file takes to check, so one file has none.
    fn each<T: Send>(&self, files: &[Input], work: impl Fn(&Input) -> T + Sync) -> Vec<T> {
        let progress = Progress::new(files.len());
        let work = |file: &Input| {
            let result = work(file);
            progress.step();
            result
        };
        let one_by_one = || files.iter().map(&work).collect();
        if files.len() < 2 || self.threads == Some(1) {
            return one_by_one();
        }
        match rayon::ThreadPoolBuilder::new()
            .num_threads(self.threads.unwrap_or(0))
            .build()
        {
            Ok(pool) => pool.install(|| files.par_iter().map(&work).collect()),
            Err(_) => one_by_one(),
        }
    }
}

/// One file read and checked, or why it cannot be read.
pub(crate) fn outcome(file: &Input, shelf: &Shelf, options: &Options) -> Result<Outcome, String> {
    let cannot = |why| format!("cannot read {}: {why}", file.name);
    let text = file.read().map_err(cannot)?;
    let path = file.path.as_path();
    let given = Given { path, text, shelf };
    let root = file.root();
    let options = Options {
        root,
        ..options.clone()
    };
    derate::check(&given, path, &file.name, &options).map_err(cannot)
}
