//! `derate completions`. Must not know which commands there are.

use clap::CommandFactory;
use clap_complete::Shell;

use super::{Cli, Done};

#[derive(clap::Args)]
pub(crate) struct Args {
    /// The shell
    shell: Shell,
}

impl Args {
    pub(crate) fn run(self) -> Done {
        let mut script = Vec::new();
        clap_complete::generate(self.shell, &mut Cli::command(), "derate", &mut script);
        Done::with(String::from_utf8_lossy(&script).into_owned())
    }
}
