//! What a replay says of each entry: agreement in a line, anything else in full.

use super::paint::Paint;
use crate::session::{ReplayEntry, ReplayReport, ReplayVerdict};

/// Longest record shown in the line of an entry that agrees, in characters.
const GLANCE: usize = 60;

/// The lines of one entry; empty for declarations, which have nothing to compare.
pub fn entry(entry: &ReplayEntry, paint: Paint) -> String {
    let number = entry.number;
    let line = |painted: fn(Paint, &str) -> String, verdict: &str, record: &[String]| {
        let record = record.first().map_or_else(String::new, |line| glance(line));
        format!("{number:>5}  {}  {record}\n", painted(paint, &format!("{verdict:<22}")))
    };
    match entry.verdict {
        ReplayVerdict::NothingToCompare => String::new(),
        ReplayVerdict::Agrees { digits: None } => line(Paint::good, "agrees exactly", &entry.recorded),
        ReplayVerdict::Agrees { digits: Some(digits) } => {
            line(Paint::good, &format!("agrees to {}", count(digits)), &entry.recorded)
        }
        ReplayVerdict::NotRecorded => line(Paint::warning, "has no record", &entry.recomputed),
        ReplayVerdict::Differs { digits_in_common } => {
            let mut shown = format!("{number:>5}  {}\n", paint.bad("differs"));
            shown.push_str(&block("entry", &entry.text.lines().collect::<Vec<_>>()));
            shown.push_str(&block("recorded", &entry.recorded));
            shown.push_str(&block("recomputed", &entry.recomputed));
            // What was expected and what came out stands in the sentence of an expectation that is not met.
            if entry.reports.is_empty() {
                let common = digits_in_common.map_or_else(|| why_not_counted(entry), count);
                shown.push_str(&block("in common", &[common]));
            }
            shown
        }
        ReplayVerdict::Failed => {
            let mut shown = format!("{number:>5}  {}\n", paint.bad("cannot be evaluated"));
            shown.push_str(&block("entry", &entry.text.lines().collect::<Vec<_>>()));
            shown.push_str(&block("recorded", &entry.recorded));
            shown
        }
        ReplayVerdict::Stopped => format!("{number:>5}  {}\n", paint.warning("stopped")),
    }
}

/// The last line: how many agree, and what else there was.
pub fn summary(name: &str, report: &ReplayReport, paint: Paint) -> String {
    let mut parts = Vec::new();
    let mut part = |count: usize, one: &str, many: &str| {
        if count > 0 {
            parts.push(format!("{count} {}", if count == 1 { one } else { many }));
        }
    };
    part(report.agree, "agrees", "agree");
    part(report.differ, "differs", "differ");
    part(report.failed, "cannot be evaluated", "cannot be evaluated");
    part(report.not_recorded, "has no record", "have no record");
    if report.stopped {
        parts.push("stopped before the end".into());
    }
    if parts.is_empty() {
        parts.push("nothing is recorded".into());
    }
    let text = parts.join(", ");
    let sound = report.differ == 0 && report.failed == 0 && !report.stopped;
    format!("{name}: {}\n", if sound { paint.good(&text) } else { paint.bad(&text) })
}

fn count(digits: u32) -> String {
    match digits {
        0 => "no digits".into(),
        1 => "1 digit".into(),
        _ => format!("{digits} digits"),
    }
}

/// Digits are not counted between exact values, nor between results of two kinds.
fn why_not_counted(entry: &ReplayEntry) -> String {
    let exact = |lines: &[String]| lines.iter().all(|line| line.starts_with('='));
    match (exact(&entry.recorded), exact(&entry.recomputed)) {
        (true, true) => "not counted: exact results are equal or not".into(),
        (a, b) if a != b => "not counted: one is exact, the other is not".into(),
        _ => "not counted: the results have different forms".into(),
    }
}

/// Lines under a word in the margin.
fn block<S: AsRef<str>>(word: &str, lines: &[S]) -> String {
    let mut shown = String::new();
    for (position, line) in lines.iter().enumerate() {
        let margin = if position == 0 { word } else { "" };
        shown.push_str(&format!("       {margin:<12}{}\n", line.as_ref()));
    }
    shown
}

/// A record as far as it fits beside the verdict.
fn glance(line: &str) -> String {
    if line.chars().count() <= GLANCE {
        return line.to_string();
    }
    let head: String = line.chars().take(GLANCE - 3).collect();
    format!("{head}...")
}

#[cfg(test)]
mod tests {
    use super::*;

    fn replayed(verdict: ReplayVerdict) -> ReplayEntry {
        ReplayEntry {
            number: 12,
            text: "pol(1/10)".into(),
            recorded: vec!["~ 4.786".into()],
            recomputed: vec!["~ 4.784".into()],
            verdict,
            reports: Vec::new(),
        }
    }

    #[test]
    fn agreement_is_one_line() {
        let shown = entry(&replayed(ReplayVerdict::Agrees { digits: Some(4) }), Paint::PLAIN);
        assert_eq!(shown, "   12  agrees to 4 digits      ~ 4.786\n");
        assert_eq!(entry(&replayed(ReplayVerdict::NothingToCompare), Paint::PLAIN), "");
    }

    #[test]
    fn a_difference_is_shown_in_full() {
        let shown = entry(&replayed(ReplayVerdict::Differs { digits_in_common: Some(3) }), Paint::PLAIN);
        let wanted = "   12  differs\n       entry       pol(1/10)\n       recorded    ~ 4.786\n       recomputed  ~ 4.784\n       \
                      in common   3 digits\n";
        assert_eq!(shown, wanted);
    }

    #[test]
    fn the_summary_counts_what_there_was() {
        let report = ReplayReport { agree: 5, differ: 1, failed: 2, ..ReplayReport::default() };
        assert_eq!(
            summary("a.ketwork", &report, Paint::PLAIN),
            "a.ketwork: 5 agree, 1 differs, 2 cannot be evaluated\n"
        );
        assert_eq!(summary("a", &ReplayReport::default(), Paint::PLAIN), "a: nothing is recorded\n");
    }

    #[test]
    fn long_records_are_shortened_beside_the_verdict() {
        assert_eq!(glance(&"7".repeat(100)).len(), GLANCE);
        assert_eq!(glance("= 9/2"), "= 9/2");
    }
}
