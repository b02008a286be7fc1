//! The prompt as a person has it: in a pseudo-terminal.
#![cfg(unix)]

use expectrl::session::OsSession;
use expectrl::{Eof, Expect};
use std::fs;
use std::path::Path;
use std::process::Command;
use std::time::Duration;

const ENTER: &str = "\r";
const TAB: &str = "\t";
const CTRL_A: &str = "\x01";
const CTRL_C: &str = "\x03";
const CTRL_D: &str = "\x04";
const RIGHT: &str = "\x1b[C";
/// What the line editor writes when it gives the terminal back.
const LINE_LEFT: &str = "\x1b[?2004l";
const UP: &str = "\x1b[A";

/// A program at a terminal, and a person who waits for what they want to see before they type on.
struct Talk {
    session: OsSession,
}

impl Talk {
    fn starts(folder: &Path, arguments: &[&str]) -> Talk {
        Talk::starts_with(folder, arguments, "1")
    }

    fn starts_with(folder: &Path, arguments: &[&str], no_color: &str) -> Talk {
        let mut command = Command::new(env!("CARGO_BIN_EXE_ketwork"));
        command
            .args(arguments)
            .current_dir(folder)
            .env("KETWORK_DATA", folder.join("data"))
            .env("TERM", "xterm")
            .env("NO_COLOR", no_color);
        let mut session = OsSession::spawn(command).expect("a pseudo-terminal");
        // Long enough for a machine under load; a test that fails takes this long, no other.
        session.set_expect_timeout(Some(Duration::from_secs(60)));
        Talk { session }
    }

    #[track_caller]
    fn sees(&mut self, text: &str) {
        if let Err(error) = self.session.expect(text) {
            let mut rest = vec![0; 4096];
            let count = self.session.try_read(&mut rest).unwrap_or(0);
            panic!("not seen: {text:?} ({error}); {:?}", String::from_utf8_lossy(&rest[..count]));
        }
    }

    #[track_caller]
    fn types(&mut self, keys: &str) {
        self.session.send(keys).expect("the terminal takes keys");
    }

    /// Types a line and waits for what it brings, then for the next prompt.
    #[track_caller]
    fn says(&mut self, line: &str, answer: &str, next: &str) {
        self.types(line);
        self.types(ENTER);
        self.sees(answer);
        self.sees(next);
    }

    /// Leaves the line with Ctrl-C, and waits until the line editor has let it go.
    #[track_caller]
    fn abandons(&mut self, next: &str) {
        self.types(CTRL_C);
        self.sees(LINE_LEFT);
        self.sees(next);
    }

    #[track_caller]
    fn ends(mut self, status: i32) {
        self.session.expect(Eof).expect("the program ends");
        let ended = self.session.get_process().wait().expect("a status");
        assert_eq!(format!("{ended:?}").rsplit(", ").next(), Some(format!("{status})").as_str()), "{ended:?}");
    }

    /// As a power loss would: no chance to say goodbye.
    fn killed(self) {
        let process = self.session.get_process().pid().to_string();
        let killed = Command::new("kill").args(["-KILL", &process]).status();
        assert!(killed.is_ok_and(|status| status.success()));
        self.session.get_process().wait().expect("it is gone");
    }
}

fn folder() -> tempfile::TempDir {
    tempfile::tempdir().expect("a temporary folder")
}

fn unsaved_journals(folder: &Path) -> usize {
    let Ok(entries) = fs::read_dir(folder.join("data")) else { return 0 };
    entries.filter_map(Result::ok).filter(|entry| entry.path().extension().is_some_and(|e| e == "unsaved")).count()
}

#[test]
fn entries_are_typed_evaluated_saved_and_opened_again() {
    let folder = folder();
    let mut talk = Talk::starts(folder.path(), &[]);
    talk.sees("`help` shows what can be typed");
    talk.sees("ket 1> ");
    talk.says("1/2 + 1/3", "  = 5/6\r\n", "ket 2> ");
    talk.says("# a note", "\r\n", "ket 2> ");
    talk.says("define a = 7", "\r\n", "ket 3> ");
    talk.says("a^2", "  = 49\r\n", "ket 4> ");
    talk.says("quit", "4 changes are not saved: `save NAME` keeps them", "ket 4> ");
    talk.says("save first", "first.ketwork", "ket 4> ");
    assert_eq!(unsaved_journals(folder.path()), 0, "saved work needs no journal");
    talk.types("quit\r");
    talk.ends(0);
    let saved = fs::read_to_string(folder.path().join("first.ketwork")).unwrap();
    assert!(saved.ends_with("1/2 + 1/3\n  = 5/6\n# a note\ndefine a = 7\na^2\n  = 49\n"), "{saved}");

    let mut talk = Talk::starts(folder.path(), &["open", "first.ketwork"]);
    talk.sees("  3  a^2\r\n       = 49\r\n");
    talk.sees("ket 4> ");
    talk.says("a + 1", "  = 8\r\n", "ket 5> ");
    talk.says("save", "saved in", "ket 5> ");
    talk.types(CTRL_D);
    talk.ends(0);
    let saved = fs::read_to_string(folder.path().join("first.ketwork")).unwrap();
    assert!(saved.ends_with("  = 49\na + 1\n  = 8\n"), "{saved}");
}

#[test]
fn an_entry_goes_on_over_lines() {
    let folder = folder();
    let mut talk = Talk::starts(folder.path(), &[]);
    talk.sees("ket 1> ");
    talk.types("(1 +\r");
    talk.sees("(1 +\r\n");
    talk.says("2) *", "2) *\r\n", "");
    talk.says("5", "  = 15\r\n", "ket 2> ");
    talk.types("list\r");
    talk.sees("  1  (1 +\r\n       2) *\r\n       5\r\n       = 15\r\n");
    talk.sees("ket 2> ");
    // An empty line ends what lacks something.
    talk.types("(3\r");
    talk.sees("(3\r\n");
    talk.types(ENTER);
    talk.sees("error: ");
    talk.sees("ket 2> ");
    // So does Ctrl-C, without a word; on an empty line it says how to leave.
    talk.types("(3\r");
    talk.sees("(3\r\n");
    talk.abandons("ket 2> ");
    talk.types(CTRL_C);
    talk.sees("`quit` or Ctrl-D leaves");
    talk.sees("ket 2> ");
    talk.types(CTRL_D);
    talk.sees("1 change is not saved");
    talk.sees("ket 2> ");
    talk.types(CTRL_D);
    talk.ends(0);
}

#[test]
fn a_pasted_session_is_taken_entry_by_entry() {
    let folder = folder();
    let mut talk = Talk::starts(folder.path(), &[]);
    talk.sees("ket 1> ");
    talk.types("\x1b[200~ketwork session 1\n# prose\ndefine a = 2\na^5\n  = 32\na^2\n\x1b[201~");
    talk.types(ENTER);
    talk.sees("  = 32\r\n  = 4\r\n");
    talk.sees("ket 4> ");
    talk.types("quit\rquit\r");
    talk.ends(0);
}

#[test]
fn words_and_names_are_completed() {
    let folder = folder();
    let mut talk = Talk::starts(folder.path(), &[]);
    talk.sees("ket 1> ");
    talk.types("defi");
    talk.types(TAB);
    talk.sees("define");
    talk.types(" susceptibility = 9/2\r");
    talk.sees("ket 2> ");
    talk.types("2*susce");
    talk.types(TAB);
    talk.sees("2*susceptibility");
    talk.types(ENTER);
    talk.sees("  = 9\r\n");
    talk.sees("ket 3> ");
    // Inside a word the rest of the word is replaced, not doubled.
    talk.types("suscexy + 1");
    talk.types(CTRL_A);
    talk.types(&RIGHT.repeat(5));
    talk.types(TAB);
    talk.sees("susceptibility + 1");
    talk.types(ENTER);
    talk.sees("  = 11/2\r\n");
    talk.sees("ket 4> ");
    // Several candidates are listed.
    talk.types("re");
    talk.types(TAB);
    talk.sees("resolvent");
    talk.abandons("ket 4> ");
    // The history brings the last entry back.
    talk.types(UP);
    talk.sees("susceptibility + 1");
    talk.types(ENTER);
    talk.sees("  = 11/2\r\n");
    talk.sees("ket 5> ");
    talk.types("quit\rquit\r");
    talk.ends(0);
}

#[test]
fn an_interrupt_ends_the_evaluation_and_keeps_the_session() {
    let folder = folder();
    let mut talk = Talk::starts(folder.path(), &[]);
    talk.sees("ket 1> ");
    talk.says("define a = 3", "\r\n", "ket 2> ");
    talk.types("sum(n in 1 .. 1000000000, a/n^2)\r");
    // The line that tells the time shows that it is running.
    talk.sees("entry 2, ");
    talk.types(CTRL_C);
    talk.sees("stopped; entry 2 is kept");
    talk.sees("ket 3> ");
    talk.says("a + 1", "  = 4\r\n", "ket 4> ");
    talk.says("revise 2 a/2", "= 3/2\r\n", "ket 4> ");
    talk.types("quit\rquit\r");
    talk.ends(0);
}

#[test]
fn an_entry_that_fails_is_not_kept_but_an_expectation_is() {
    let folder = folder();
    let mut talk = Talk::starts(folder.path(), &[]);
    talk.sees("ket 1> ");
    talk.says("2 + foo", "`foo` is not known here", "ket 1> ");
    talk.types(UP);
    talk.sees("2 + foo");
    talk.types("\x7f\x7f\x7f3\r");
    talk.sees("  = 5\r\n");
    talk.sees("ket 2> ");
    talk.says("expect 2 = 3", "expected 3, and the value is 2", "ket 3> ");
    talk.says("list", "  2  expect 2 = 3\r\n       failed\r\n", "ket 3> ");
    talk.types("quit\rquit\r");
    talk.ends(0);
}

#[test]
fn an_entry_is_revised_in_place() {
    let folder = folder();
    let mut talk = Talk::starts(folder.path(), &[]);
    talk.sees("ket 1> ");
    talk.says("define a = 3", "\r\n", "ket 2> ");
    talk.says("10 a", "  = 30\r\n", "ket 3> ");
    talk.says("10 + 1", "  = 11\r\n", "ket 4> ");
    talk.types("revise 1\r");
    talk.sees("ket 1> define a = 3");
    talk.types("3/2\r");
    talk.sees("entry 1 is revised, and 1 more evaluated again");
    talk.sees("  1  define a = 33/2\r\n  2  10 a\r\n       = 165\r\n");
    talk.sees("ket 4> ");
    talk.says("drop 1", "entry 1 binds `a`, which entry 2 still uses", "ket 4> ");
    talk.says("drop 2", "entry 2 is taken out", "ket 3> ");
    talk.says("drop 1", "entry 1 is taken out", "ket 2> ");
    talk.says("revise 7", "there is no entry 7; the session has 1", "ket 2> ");
    talk.types("quit\rquit\r");
    talk.ends(0);
}

#[test]
fn unsaved_work_survives_a_crash() {
    let folder = folder();
    let mut talk = Talk::starts(folder.path(), &[]);
    talk.sees("ket 1> ");
    talk.says("define a = 3", "\r\n", "ket 2> ");
    talk.says("10 a", "  = 30\r\n", "ket 3> ");
    talk.says("define a = 4", "= 40\r\n", "ket 3> ");
    talk.says("# remember", "\r\n", "ket 3> ");
    talk.says("1 + (", "1 + (\r\n", "");
    talk.says("2", "2\r\n", "");
    talk.says(")", "  = 3\r\n", "ket 4> ");
    // While its prompt lives the work is nobody else's.
    let mut other = Talk::starts(folder.path(), &[]);
    other.sees("leaves");
    other.sees("ket 1> ");
    other.says("recover", "no work was left unsaved", "ket 1> ");
    other.types("quit\r");
    other.ends(0);
    talk.killed();
    assert_eq!(unsaved_journals(folder.path()), 1);

    let mut talk = Talk::starts(folder.path(), &[]);
    talk.sees("work was left unsaved");
    talk.sees("1  3 entries of a new session, less than a minute ago");
    talk.sees("ket 1> ");
    talk.types("recover\r");
    talk.sees("  1  define a = 4\r\n  2  10 a\r\n       = 40\r\n");
    talk.sees("  3  1 + (\r\n");
    talk.sees("taken back");
    talk.sees("ket 4> ");
    talk.killed();

    // Taken back and lost again: it is still there.
    let mut talk = Talk::starts(folder.path(), &[]);
    talk.sees("1  3 entries of a new session");
    talk.sees("ket 1> ");
    talk.types("recover\r");
    talk.sees("ket 4> ");
    talk.says("save kept", "kept.ketwork", "ket 4> ");
    talk.types("quit\r");
    talk.ends(0);
    assert_eq!(unsaved_journals(folder.path()), 0);
    let saved = fs::read_to_string(folder.path().join("kept.ketwork")).unwrap();
    assert!(saved.ends_with("define a = 4\n10 a\n  = 40\n# remember\n1 + (\n  2\n  )\n  = 3\n"), "{saved}");
}

#[test]
fn a_crash_during_an_evaluation_keeps_its_entry() {
    let folder = folder();
    fs::write(folder.path().join("own.ketwork"), "ketwork session 1\ndefine a = 3\n").unwrap();
    let mut talk = Talk::starts(folder.path(), &["open", "own.ketwork"]);
    talk.sees("ket 2> ");
    talk.types("sum(n in 1 .. 1000000000, a/n^2)\r");
    talk.sees("entry 2, ");
    talk.killed();

    let mut talk = Talk::starts(folder.path(), &["open", "own.ketwork"]);
    talk.sees("1  2 entries of ");
    talk.sees("own.ketwork");
    talk.sees("ket 2> ");
    talk.says("discard", "deleted", "ket 2> ");
    talk.types("quit\r");
    talk.ends(0);
    assert_eq!(unsaved_journals(folder.path()), 0);
}

#[test]
fn a_file_changed_by_somebody_else_is_not_overwritten() {
    let folder = folder();
    let file = folder.path().join("shared.ketwork");
    fs::write(&file, "ketwork session 1\n1 + 1\n").unwrap();
    let mut talk = Talk::starts(folder.path(), &["open", "shared.ketwork"]);
    talk.sees("ket 2> ");
    talk.says("2 + 2", "  = 4\r\n", "ket 3> ");
    fs::write(&file, "ketwork session 1\n3 + 3\n").unwrap();
    talk.says("save", "has been changed by somebody else", "ket 3> ");
    assert_eq!(fs::read_to_string(&file).unwrap(), "ketwork session 1\n3 + 3\n");
    talk.says("save mine", "mine.ketwork", "ket 3> ");
    talk.types("quit\r");
    talk.ends(0);
    assert!(fs::read_to_string(folder.path().join("mine.ketwork")).unwrap().contains("2 + 2\n  = 4\n"));
}

#[test]
fn colours_are_shown_at_a_terminal_and_can_be_refused() {
    let folder = folder();
    let mut talk = Talk::starts_with(folder.path(), &[], "");
    talk.sees("ket 1> ");
    talk.types("1 + 1\r");
    talk.sees("\u{1b}[36m= 2\u{1b}[0m");
    talk.sees("ket 2> ");
    talk.types("quit\rquit\r");
    talk.ends(0);
    let mut talk = Talk::starts(folder.path(), &[]);
    talk.sees("ket 1> ");
    talk.says("1 + 1", "  = 2\r\n", "ket 2> ");
    talk.types("quit\rquit\r");
    talk.ends(0);
}
