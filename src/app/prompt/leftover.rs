//! Describes work that a crash left behind.

use crate::app::files::journal::Leftover;
use crate::lang::file::parse_session;
use std::path::Path;
use std::time::{Duration, SystemTime};

/// How much it is, of which session, and how old.
pub fn described(leftover: &Leftover) -> String {
    let age = SystemTime::now().duration_since(leftover.changed).unwrap_or_default();
    describe(parse_session(&leftover.text).entries().count(), leftover.owner.file.as_deref(), age)
}

fn describe(entries: usize, file: Option<&Path>, age: Duration) -> String {
    let entries = if entries == 1 { "1 entry".to_string() } else { format!("{entries} entries") };
    let session = file.map_or_else(|| "a new session".to_string(), |path| path.display().to_string());
    format!("{entries} of {session}, {}", ago(age))
}

fn ago(age: Duration) -> String {
    let minutes = age.as_secs() / 60;
    let (count, unit) = match minutes {
        0 => return "less than a minute ago".into(),
        1..60 => (minutes, "minute"),
        60..1440 => (minutes / 60, "hour"),
        _ => (minutes / 1440, "day"),
    };
    format!("{count} {unit}{} ago", if count == 1 { "" } else { "s" })
}

#[cfg(test)]
mod tests {
    use super::*;

    #[test]
    fn left_work_is_described() {
        assert_eq!(describe(1, None, Duration::from_secs(59)), "1 entry of a new session, less than a minute ago");
        assert_eq!(
            describe(12, Some(Path::new("a.ketwork")), Duration::from_secs(7300)),
            "12 entries of a.ketwork, 2 hours ago"
        );
        assert_eq!(ago(Duration::from_secs(86_400)), "1 day ago");
    }
}
