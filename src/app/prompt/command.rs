//! Commands of the prompt: what can be typed there and never stands in a file.

/// A command with what was typed behind it.
#[derive(Clone, PartialEq, Eq, Debug)]
pub enum Command {
    /// `save`, `save NAME`, `save over`, `save over NAME`
    Save {
        over: bool,
        name: Option<String>,
    },
    Open(String),
    /// `revise N`, `revise N TEXT`
    Revise {
        number: usize,
        text: Option<String>,
    },
    Drop(usize),
    /// `list`, `list N`
    List(Option<usize>),
    /// Evaluates what was stopped.
    Resume,
    Export,
    Help(String),
    /// Takes back what a crash left, by its number in the list.
    Recover(usize),
    /// Deletes what a crash left.
    Discard(usize),
    Quit,
}

/// The words commands begin with.
pub const WORDS: [&str; 11] =
    ["save", "open", "revise", "drop", "list", "resume", "export", "help", "recover", "discard", "quit"];

/// Says whether a line is a command.
pub fn is_command(line: &str) -> bool {
    let (word, _) = split(line);
    WORDS.contains(&word)
}

/// Reads a command line.
///
/// *Errors*: how the command is to be typed.
pub fn parse(line: &str) -> Result<Command, String> {
    let (word, rest) = split(line);
    let alone = |command: Command| {
        if rest.is_empty() {
            Ok(command)
        } else {
            Err(format!("`{word}` stands alone; `{}` is too much", shortened(rest)))
        }
    };
    match word {
        "save" => Ok(save(rest)),
        "open" if rest.is_empty() => Err("which file? write `open stark.ketwork`".into()),
        "open" => Ok(Command::Open(rest.to_string())),
        "revise" => revise(rest),
        "drop" => Ok(Command::Drop(number(rest, "which entry? write `drop 3`")?)),
        "list" if rest.is_empty() => Ok(Command::List(None)),
        "list" => Ok(Command::List(Some(number(rest, "write `list`, or `list 3` for one entry")?))),
        "resume" => alone(Command::Resume),
        "export" => Ok(Command::Export),
        "help" => Ok(Command::Help(rest.to_string())),
        "recover" => {
            Ok(Command::Recover(first_unless(rest, "write `recover`, or `recover 2` for the second in the list")?))
        }
        "discard" => {
            Ok(Command::Discard(first_unless(rest, "write `discard`, or `discard 2` for the second in the list")?))
        }
        "quit" => alone(Command::Quit),
        other => Err(format!("`{other}` is not a command; `help prompt` lists them")),
    }
}

fn split(line: &str) -> (&str, &str) {
    let line = line.trim();
    let end = line.find(char::is_whitespace).unwrap_or(line.len());
    (&line[..end], line[end..].trim())
}

fn save(rest: &str) -> Command {
    let (first, behind) = split(rest);
    let (over, name) = if first == "over" { (true, behind) } else { (false, rest) };
    Command::Save { over, name: (!name.is_empty()).then(|| name.to_string()) }
}

fn revise(rest: &str) -> Result<Command, String> {
    let (first, text) = split(rest);
    let number = number(first, "which entry? write `revise 3`, or `revise 3 define a = 2`")?;
    Ok(Command::Revise { number, text: (!text.is_empty()).then(|| text.to_string()) })
}

fn number(text: &str, help: &str) -> Result<usize, String> {
    match text.parse() {
        Ok(number) if number > 0 => Ok(number),
        _ if text.is_empty() => Err(help.to_string()),
        _ => Err(format!("`{}` is not the number of an entry: {help}", shortened(text))),
    }
}

fn first_unless(text: &str, help: &str) -> Result<usize, String> {
    if text.is_empty() { Ok(1) } else { number(text, help) }
}

fn shortened(text: &str) -> String {
    if text.chars().count() <= 30 { text.to_string() } else { text.chars().take(27).chain("...".chars()).collect() }
}

#[cfg(test)]
mod tests {
    use super::*;
    use crate::lang::vocabulary::{WordKind, vocabulary};
    use std::collections::BTreeSet;

    #[test]
    fn commands_are_read() {
        assert_eq!(parse("save"), Ok(Command::Save { over: false, name: None }));
        assert_eq!(parse("save  my file "), Ok(Command::Save { over: false, name: Some("my file".into()) }));
        assert_eq!(parse("save over a"), Ok(Command::Save { over: true, name: Some("a".into()) }));
        assert_eq!(parse("revise 3"), Ok(Command::Revise { number: 3, text: None }));
        assert_eq!(
            parse("revise 3 define a = 2"),
            Ok(Command::Revise { number: 3, text: Some("define a = 2".into()) })
        );
        assert_eq!(parse("discard"), Ok(Command::Discard(1)));
        assert_eq!(parse("help spin_orbit"), Ok(Command::Help("spin_orbit".into())));
    }

    #[test]
    fn what_is_missing_is_said() {
        for line in
            ["open", "drop", "drop x", "drop 0", "drop -1", "revise", "revise x", "quit now", "recover x", "list all"]
        {
            assert!(parse(line).is_err(), "{line}");
        }
    }

    #[test]
    fn every_word_is_a_command() {
        for word in WORDS {
            assert!(is_command(word) && is_command(&format!(" {word} 1")));
            let known = parse(&format!("{word} 1")).err().into_iter().chain(parse(word).err());
            assert!(known.into_iter().all(|message| !message.contains("not a command")), "{word}");
        }
        let listed: BTreeSet<&str> = vocabulary().of_kind(WordKind::Command).map(|word| word.name.as_str()).collect();
        assert_eq!(listed, WORDS.into_iter().collect(), "the vocabulary explains the commands there are");
        assert!(!is_command("saved") && !is_command("2 + 3") && !is_command(""));
    }
}
