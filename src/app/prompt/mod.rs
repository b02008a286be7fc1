//! The prompt: a conversation about one session, typed at a terminal or read from a pipe.

mod command;
mod completion;
mod dialogue;
mod gather;
mod helper;
mod keeping;
mod layout;
mod leftover;
mod notebook;
mod pipe;
mod terminal;

use super::console::{Console, OutputEnd, tell};
use super::files::data::data_folder;
use super::files::journal::{Safety, left_behind};
use super::interrupt::{Interrupts, WhenIdle};
use super::progress::Progress;
use super::status::Status;
use super::worker::Worker;
use dialogue::Dialogue;
use notebook::Notebook;
use std::path::Path;
use terminal::Terminal;

/// What `export` answers in this version.
pub const EXPORT_NOT_YET: &str = "not available yet: reports of a session (html, tex, md, json, csv); `ketwork run --json` gives the results machine-readable";

/// Starts a conversation, with the session of a file or a new one.
pub fn start(console: Console, file: Option<&Path>) -> Status {
    match converse(console, file) {
        Ok(status) => status,
        Err(OutputEnd::Closed) => Status::OutputClosed,
        Err(OutputEnd::Broken(reason)) => {
            tell(&format!("the output cannot be written: {reason}"));
            Status::OutputClosed
        }
    }
}

fn converse(console: Console, file: Option<&Path>) -> Result<Status, OutputEnd> {
    let when_idle = if console.interactive { WhenIdle::Stay } else { WhenIdle::Leave };
    let worker = Worker {
        interrupts: Interrupts::listen(when_idle),
        progress: Progress::new(console.messages_at_terminal && console.interactive),
    };
    let data = data_folder();
    let safety = if console.interactive { Safety::PowerLoss } else { Safety::Crash };
    let mut dialogue = Dialogue::new(console, worker, Notebook::new(data.clone(), safety));
    if console.interactive {
        let greeting = format!("ketwork {}: `help` shows what can be typed, `quit` leaves", env!("CARGO_PKG_VERSION"));
        tell(&console.messages.faint(&greeting));
    }
    if let Some(file) = file
        && !dialogue.open(file)?
    {
        return Ok(Status::Unusable);
    }
    // Work that belongs to another file waits until that one is opened.
    let own = dialogue.notebook.file.as_ref().map(|file| file.path.clone());
    dialogue.leftovers = left_behind(data.as_deref());
    dialogue.leftovers.retain(|leftover| own.is_none() || leftover.owner.file == own);
    dialogue.tell_leftovers();
    if !console.interactive {
        return pipe::converse(&mut dialogue);
    }
    let history = data.map(|folder| folder.join("history"));
    match Terminal::new(&dialogue, history) {
        Ok(mut terminal) => terminal.converse(&mut dialogue),
        Err(error) => {
            tell(&format!("the terminal does not answer: {error}"));
            Ok(Status::Unusable)
        }
    }
}
