//! The exit statuses, and which of two is told when a command has done several things.

use std::process::ExitCode;

/// How a command ended, in rising order of what the caller must know.
#[derive(Clone, Copy, PartialEq, Eq, PartialOrd, Ord, Debug)]
pub enum Status {
    /// Everything held.
    Fine,
    /// An entry of the session failed, or a replay differs from the record.
    Failed,
    /// Wrong usage, a file that cannot be read, or a record that cannot be evaluated again.
    Unusable,
    /// Whoever read the output has closed it, or it cannot be written.
    OutputClosed,
}

impl Status {
    /// The number the shell sees.
    pub fn code(self) -> u8 {
        match self {
            Status::Fine => 0,
            Status::Failed => 1,
            Status::Unusable => 2,
            Status::OutputClosed => 3,
        }
    }

    /// The graver of two.
    #[must_use]
    pub fn and(self, other: Status) -> Status {
        self.max(other)
    }
}

impl From<Status> for ExitCode {
    fn from(status: Status) -> Self {
        ExitCode::from(status.code())
    }
}
