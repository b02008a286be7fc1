//! What a person runs: arguments, prompt, batch, files, interrupts. The only folder that touches the outside world.

mod args;
mod batch;
mod console;
mod files;
mod interrupt;
mod progress;
mod prompt;
mod provenance;
mod replay;
mod run;
mod source;
mod status;
mod worker;

use args::{Arguments, Command};
use batch::Batch;
use clap::Parser;
use clap::error::{ContextKind, ContextValue};
use console::{Console, OutputEnd, print, tell};
use status::Status;
use std::ffi::OsString;
use std::path::Path;
use std::process::ExitCode;

/// Does what the command line asks for and gives the exit status.
pub fn run(arguments: impl IntoIterator<Item = OsString>) -> ExitCode {
    let arguments = match Arguments::try_parse_from(arguments) {
        Ok(arguments) => arguments,
        Err(told) => {
            // Also `--help` and `--version` come this way.
            let status = if told.use_stderr() { Status::Unusable } else { Status::Fine };
            let printed = told.print().is_ok();
            if let Some(file) = file_without_command(&told) {
                tell(&format!(
                    "what shall be done with it? `ketwork open {file}`, `ketwork run {file}` or `ketwork replay {file}`"
                ));
            }
            return if printed { status.into() } else { Status::OutputClosed.into() };
        }
    };
    worker::announce_mistakes();
    let console = Console::look();
    let status = match arguments.command {
        None => prompt::start(console, None),
        Some(Command::Open { file }) => prompt::start(console, Some(&file)),
        Some(Command::Run { file, json }) => run::run(&Batch::new(console), &file, json),
        Some(Command::Replay { files }) => replay::replay(&Batch::new(console), &files),
        Some(Command::Export { .. }) => {
            tell(prompt::EXPORT_NOT_YET);
            Status::Unusable
        }
        Some(Command::Help { words }) => help(console, &words),
    };
    status.into()
}

/// The word that is no command, when it is a file.
fn file_without_command(told: &clap::Error) -> Option<String> {
    match told.get(ContextKind::InvalidSubcommand) {
        Some(ContextValue::String(word)) if Path::new(word).is_file() => Some(word.clone()),
        _ => None,
    }
}

fn help(console: Console, words: &[String]) -> Status {
    let page = match crate::report::help::page(&words.join(" "), console.results) {
        Ok(page) => page,
        Err(message) => {
            tell(&message);
            return Status::Unusable;
        }
    };
    match print(&page) {
        Ok(()) => Status::Fine,
        Err(OutputEnd::Closed) => Status::OutputClosed,
        Err(OutputEnd::Broken(reason)) => {
            tell(&format!("the output cannot be written: {reason}"));
            Status::OutputClosed
        }
    }
}
