//! An entry and what came of it, as the prompt and `list` show it.

use super::paint::Paint;
use crate::session::{EntryView, Outcome};

/// The result below its entry, a line each, indented by `indent`; empty when there is nothing to show.
pub fn outcome(outcome: &Outcome, indent: &str, paint: Paint) -> String {
    let mut shown = String::new();
    let mut line = |text: String| shown.push_str(&format!("{indent}{text}\n"));
    match outcome {
        Outcome::Declared { told } => told.iter().for_each(|text| line(paint.faint(text))),
        Outcome::Result(answer) => {
            answer.lines.iter().for_each(|text| line(paint.result(text)));
            answer.decimal.iter().for_each(|text| line(paint.faint(&format!("({text})"))));
            answer.remarks.iter().for_each(|text| line(paint.faint(&format!("({text})"))));
            answer.notes.iter().for_each(|text| line(paint.warning(&format!("({text})"))));
        }
        Outcome::Failed(_) => line(paint.bad("failed")),
        Outcome::Stopped => line(paint.warning("stopped")),
    }
    shown
}

/// An entry with its number in front and its result below.
pub fn numbered(view: &EntryView<'_>, paint: Paint) -> String {
    let number = format!("{:>3}", view.number);
    let mut shown = String::new();
    for (position, line) in view.text.lines().enumerate() {
        let margin = if position == 0 { paint.faint(&number) } else { " ".repeat(number.len()) };
        shown.push_str(&format!("{margin}  {line}"));
        if position + 1 < view.text.lines().count() {
            shown.push('\n');
        }
    }
    if let Some(comment) = view.comment {
        shown.push_str(&paint.faint(&format!("  # {comment}")));
    }
    shown.push('\n');
    match view.outcome {
        Some(done) => shown.push_str(&outcome(done, "       ", paint)),
        None => shown.push_str(&format!("       {}\n", paint.faint("not evaluated"))),
    }
    shown
}

#[cfg(test)]
mod tests {
    use super::*;
    use crate::lang::tree::Span;
    use crate::session::{Answer, AnswerKind};

    fn answer() -> Outcome {
        Outcome::Result(Answer {
            lines: vec!["~ 0.5".into()],
            kind: AnswerKind::Approximate,
            value: Some("0.5".into()),
            digits: Some(1),
            unit: None,
            decimal: None,
            verdict: "fewer digits than asked".into(),
            remarks: Vec::new(),
            notes: vec!["1 of the 30 digits asked hold".into()],
        })
    }

    #[test]
    fn entries_are_shown_with_number_and_result() {
        let outcome = answer();
        let view = EntryView {
            number: 7,
            text: "1 +\n  2",
            outcome: Some(&outcome),
            recorded: Vec::new(),
            prose_before: Vec::new(),
            comment: Some("why"),
            span: Span::default(),
        };
        let wanted = "  7  1 +\n       2  # why\n       ~ 0.5\n       (1 of the 30 digits asked hold)\n";
        assert_eq!(numbered(&view, Paint::PLAIN), wanted);
    }

    #[test]
    fn declarations_show_only_what_they_tell() {
        let told = Outcome::Declared { told: vec!["energy -1/2".into()] };
        assert_eq!(outcome(&told, "  ", Paint::PLAIN), "  energy -1/2\n");
        assert_eq!(outcome(&Outcome::Declared { told: Vec::new() }, "  ", Paint::PLAIN), "");
        assert_eq!(outcome(&Outcome::Stopped, "  ", Paint::PLAIN), "  stopped\n");
    }
}
