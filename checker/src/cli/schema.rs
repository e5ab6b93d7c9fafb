//! `derate schema`. Must not know what the schema says.

use std::path::PathBuf;

use derate::render::json;

use super::Done;

#[derive(clap::Args)]
pub(crate) struct Args {
    /// Write to this file instead of standard output
    #[arg(long, value_name = "FILE")]
    out: Option<PathBuf>,
}

impl Args {
    pub(crate) fn run(self) -> Done {
        Done::with(json::schema()).into_file(self.out)
    }
}
