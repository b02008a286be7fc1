//! Input that nobody types: lines from a pipe or a file, without a prompt.

use super::dialogue::{Dialogue, Next};
use super::gather::{Gather, Unit};
use crate::app::console::{OutputEnd, tell};
use crate::app::status::Status;
use crate::lang::LONGEST_ENTRY;
use std::io::{self, BufRead, Read};

/// Reads lines to the end and does what they say.
pub fn converse(dialogue: &mut Dialogue) -> Result<Status, OutputEnd> {
    let mut input = io::stdin().lock();
    let mut gather = Gather::default();
    loop {
        let line = match bounded_line(&mut input) {
            Ok(Some(line)) => line,
            Ok(None) => break,
            Err(reason) => {
                tell(&reason);
                return Ok(Status::Unusable);
            }
        };
        for unit in gather.line(&line) {
            if dialogue.take(&unit)? == Next::Leave {
                return Ok(status(dialogue));
            }
        }
    }
    if let Some(unit) = gather.rest() {
        dialogue.take(&unit)?;
    }
    dialogue.end_of_input();
    Ok(status(dialogue))
}

fn status(dialogue: &Dialogue) -> Status {
    if dialogue.failed { Status::Failed } else { Status::Fine }
}

/// One line of bounded length, without its end.
fn bounded_line(input: &mut impl BufRead) -> Result<Option<String>, String> {
    // A little more than an entry may have, so that the parser can say what is wrong with one that is just too long.
    let limit = LONGEST_ENTRY + (LONGEST_ENTRY >> 4);
    let mut bytes = Vec::new();
    input
        .by_ref()
        .take(limit as u64)
        .read_until(b'\n', &mut bytes)
        .map_err(|error| format!("standard input cannot be read: {error}"))?;
    if bytes.is_empty() {
        return Ok(None);
    }
    if bytes.len() == limit && !bytes.ends_with(b"\n") {
        return Err(format!("a line of standard input has more than {LONGEST_ENTRY} bytes; an entry is shorter"));
    }
    if bytes.contains(&0) {
        return Err("standard input is not text: there is a NUL byte in it".into());
    }
    let text = String::from_utf8(bytes).map_err(|_| "standard input is not text: it is not UTF-8".to_string())?;
    Ok(Some(text.trim_end_matches(['\n', '\r']).to_string()))
}

/// Does everything a text says; used for what is typed at a terminal as well.
pub fn all(dialogue: &mut Dialogue, text: &str) -> Result<Next, OutputEnd> {
    let units: Vec<Unit> = Gather::all(text);
    for unit in units {
        match dialogue.take(&unit)? {
            Next::Go => {}
            next => return Ok(next),
        }
    }
    Ok(Next::Go)
}

#[cfg(test)]
mod tests {
    use super::*;

    #[test]
    fn lines_are_read_one_by_one_and_never_beyond_a_limit() {
        let mut input = &b"a\r\nb"[..];
        assert_eq!(bounded_line(&mut input), Ok(Some("a".into())));
        assert_eq!(bounded_line(&mut input), Ok(Some("b".into())));
        assert_eq!(bounded_line(&mut input), Ok(None));
        assert!(bounded_line(&mut io::BufReader::new(io::repeat(b'x'))).is_err());
        assert!(bounded_line(&mut &b"\xff"[..]).is_err() && bounded_line(&mut &b"\0"[..]).is_err());
    }
}
