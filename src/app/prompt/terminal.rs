//! The prompt at a terminal: reads lines with editing, completion and history.

use super::dialogue::{Dialogue, Next};
use super::helper::EntryHelper;
use super::layout::{as_kept, for_editing, prompt};
use super::pipe;
use crate::app::console::{OutputEnd, tell};
use crate::app::status::Status;
use crate::lang::extent::is_incomplete;
use rustyline::error::ReadlineError;
use rustyline::history::DefaultHistory;
use rustyline::{
    Cmd, ColorMode, CompletionType, ConditionalEventHandler, Config, Editor, Event, EventContext, EventHandler,
    KeyCode, KeyEvent, Modifiers, RepeatCount,
};
use std::io::IsTerminal;
use std::path::PathBuf;
use std::sync::Arc;
use std::sync::atomic::{AtomicBool, AtomicUsize, Ordering};

/// Lines kept in the history.
const LONGEST_HISTORY: usize = 2000;

/// A line editor with the session's history.
pub struct Terminal {
    editor: Editor<EntryHelper, DefaultHistory>,
    history: Option<PathBuf>,
    prompt_width: Arc<AtomicUsize>,
    /// Whether the line was empty when Ctrl-C was pressed.
    left_empty: Arc<AtomicBool>,
}

impl Terminal {
    /// Takes hold of the terminal.
    ///
    /// *Errors*: the terminal does not answer.
    pub fn new(dialogue: &Dialogue, history: Option<PathBuf>) -> rustyline::Result<Self> {
        let paint = dialogue.console.results;
        let config = Config::builder()
            .max_history_size(LONGEST_HISTORY)?
            .completion_type(CompletionType::List)
            .completion_show_all_if_ambiguous(true)
            .color_mode(if paint.is_on() { ColorMode::Enabled } else { ColorMode::Disabled })
            .build();
        let mut editor = Editor::with_config(config)?;
        editor.set_helper(Some(EntryHelper { paint, names: Vec::new(), prompt_width: 0 }));
        if let Some(history) = &history {
            // There is none at the first start.
            let _ = editor.load_history(history);
        }
        let prompt_width = Arc::new(AtomicUsize::new(0));
        let left_empty = Arc::new(AtomicBool::new(true));
        // What was typed during an evaluation comes with line ends of the other kind.
        for key in [KeyEvent(KeyCode::Enter, Modifiers::NONE), KeyEvent::ctrl('J')] {
            let enter = EnterKey { prompt_width: prompt_width.clone() };
            editor.bind_sequence(key, EventHandler::Conditional(Box::new(enter)));
        }
        let interrupt = InterruptKey { left_empty: left_empty.clone() };
        editor.bind_sequence(KeyEvent::ctrl('C'), EventHandler::Conditional(Box::new(interrupt)));
        Ok(Terminal { editor, history, prompt_width, left_empty })
    }

    /// Talks until the person leaves.
    pub fn converse(&mut self, dialogue: &mut Dialogue) -> Result<Status, OutputEnd> {
        let mut next = Next::Go;
        loop {
            let (number, initial) = match &next {
                Next::Leave => return Ok(Status::Fine),
                Next::Go => (dialogue.next_number(), None),
                Next::Edit { number, text } => (*number, Some(text.clone())),
            };
            let read = self.read(dialogue, number, initial.as_deref());
            next = match read {
                Ok(text) => match initial {
                    Some(before) if text.trim().is_empty() || text == before => {
                        tell(&dialogue.console.messages.faint(&format!("entry {number} stays as it is")));
                        Next::Go
                    }
                    Some(_) => dialogue.revise(number, &text).map(|()| Next::Go)?,
                    None => pipe::all(dialogue, &text)?,
                },
                Err(ReadlineError::Interrupted) => {
                    if self.left_empty.load(Ordering::Relaxed) {
                        tell(
                            &dialogue.console.messages.faint("`quit` or Ctrl-D leaves, `help` shows what can be typed"),
                        );
                    }
                    Next::Go
                }
                Err(ReadlineError::Eof) if std::io::stdin().is_terminal() => dialogue.end_of_input(),
                // The terminal has gone: unsaved work stays in its journal.
                Err(ReadlineError::Eof) => return Ok(Status::OutputClosed),
                Err(error) => {
                    tell(&format!("the terminal does not answer any more: {error}"));
                    return Ok(Status::OutputClosed);
                }
            };
        }
    }

    /// Reads one piece of input, which may be an entry of several lines or a pasted part of a session.
    fn read(&mut self, dialogue: &Dialogue, number: usize, initial: Option<&str>) -> rustyline::Result<String> {
        let plain = prompt(number);
        let width = plain.len();
        self.prompt_width.store(width, Ordering::Relaxed);
        if let Some(helper) = self.editor.helper_mut() {
            helper.names = dialogue.notebook.session.names();
            helper.prompt_width = width;
        }
        let shown = (plain.clone(), dialogue.console.results.heading(&plain));
        let typed = match initial {
            Some(text) => self.editor.readline_with_initial(&shown, (&for_editing(text, width), ""))?,
            None => self.editor.readline(&shown)?,
        };
        let kept = as_kept(&typed, width);
        self.remember(&kept);
        Ok(kept)
    }

    fn remember(&mut self, text: &str) {
        let added = self.editor.add_history_entry(text).unwrap_or(false);
        if let (true, Some(history)) = (added, &self.history) {
            // A history that cannot be written is no reason to disturb anybody.
            let _ = history.parent().map(std::fs::create_dir_all);
            let _ = self.editor.append_history(history);
        }
    }
}

/// The Enter key: an entry that goes on gets a new line below its beginning.
struct EnterKey {
    prompt_width: Arc<AtomicUsize>,
}

impl ConditionalEventHandler for EnterKey {
    fn handle(&self, _: &Event, _: RepeatCount, _: bool, context: &EventContext<'_>) -> Option<Cmd> {
        let goes_on = context.pos() == context.line().len() && is_incomplete(context.line());
        goes_on.then(|| Cmd::Insert(1, format!("\n{}", " ".repeat(self.prompt_width.load(Ordering::Relaxed)))))
    }
}

/// Ctrl-C: remembers whether there was anything on the line, and lets the editor leave it.
struct InterruptKey {
    left_empty: Arc<AtomicBool>,
}

impl ConditionalEventHandler for InterruptKey {
    fn handle(&self, _: &Event, _: RepeatCount, _: bool, context: &EventContext<'_>) -> Option<Cmd> {
        self.left_empty.store(context.line().trim().is_empty(), Ordering::Relaxed);
        None
    }
}
