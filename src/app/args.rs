//! The command line as it is typed.

use clap::{Parser, Subcommand};
use std::path::PathBuf;

/// A notebook at the prompt for perturbation sums of atoms: Dirac notation, exact angular algebra, any number of digits.
///
/// Without a command it starts a new session at the prompt.
#[derive(Parser, Debug)]
#[command(name = "ketwork", version, disable_help_subcommand = true)]
pub struct Arguments {
    #[command(subcommand)]
    pub command: Option<Command>,
}

#[derive(Subcommand, Debug)]
pub enum Command {
    /// Opens a saved session at the prompt
    Open {
        /// The session file
        file: PathBuf,
    },
    /// Evaluates a session and prints every entry with its record, in the format of the file
    Run {
        /// The session file; `-` reads standard input
        file: PathBuf,
        /// Prints one JSON object a line for every entry
        #[arg(long)]
        json: bool,
    },
    /// Evaluates sessions again and compares with what they record
    Replay {
        /// The session files; `-` reads standard input
        #[arg(required = true)]
        files: Vec<PathBuf>,
    },
    /// Writes a report of a session
    Export {
        /// The session file
        file: PathBuf,
        /// The report; its ending chooses the form
        #[arg(long, value_name = "REPORT")]
        to: PathBuf,
    },
    /// Explains a word of the session language
    Help {
        /// An entry, system, operator, function or unit, or a group: `entries`, `operators`, `functions`, `systems`, `prompt`
        words: Vec<String>,
    },
}
