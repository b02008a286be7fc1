//! Standard output and standard error as the program sees them: what may be coloured, and who has stopped reading.

use crate::report::paint::Paint;
use std::io::{self, IsTerminal, Write};

/// Why nothing more can be written to standard output.
#[derive(Clone, PartialEq, Eq, Debug)]
pub enum OutputEnd {
    /// The reader has closed it, as `head` does; nothing is said about it.
    Closed,
    /// It cannot be written, for the reason given.
    Broken(String),
}

/// The terminal, or what stands in its place.
#[derive(Clone, Copy, Debug)]
pub struct Console {
    /// How results on standard output are painted.
    pub results: Paint,
    /// How messages on standard error are painted.
    pub messages: Paint,
    /// Whether a person can be shown a progress line.
    pub messages_at_terminal: bool,
    /// Whether a person is typing.
    pub interactive: bool,
}

impl Console {
    /// Looks at the streams and at `NO_COLOR`.
    pub fn look() -> Self {
        let refused = std::env::var_os("NO_COLOR").is_some_and(|value| !value.is_empty())
            || std::env::var_os("TERM").is_some_and(|value| value == "dumb");
        let output = io::stdout().is_terminal();
        let error = io::stderr().is_terminal();
        // Whether to colour is decided here, stream by stream; the library that writes the colours must not decide again.
        colored::control::set_override(!refused && (output || error));
        Console {
            results: Paint::new(output && !refused),
            messages: Paint::new(error && !refused),
            messages_at_terminal: error,
            interactive: output && io::stdin().is_terminal(),
        }
    }
}

/// Writes results.
pub fn print(text: &str) -> Result<(), OutputEnd> {
    let mut stream = io::stdout().lock();
    stream.write_all(text.as_bytes()).and_then(|()| stream.flush()).map_err(|error| match error.kind() {
        io::ErrorKind::BrokenPipe => OutputEnd::Closed,
        _ => OutputEnd::Broken(error.to_string()),
    })
}

/// Writes a message and a line end to standard error; when nobody can read it there is nobody to tell.
pub fn tell(message: &str) {
    let _ = writeln!(io::stderr().lock(), "{message}");
}
