//! `paths`: the exact decomposition of an expression over intermediate blocks, in lines.

use super::evaluate::Wrong;
use super::outcome::{Answer, AnswerKind};
use crate::angular::HalfInteger;
use crate::angular::paths::Columns;
use crate::angular::tensor::IDENTITY;
use crate::angular::verdict::{Analysis, ChainReport, Residual, Verdict, Where, Whole, analyse};
use crate::num::{Effort, Surd};
use crate::sums::{AngularSum, Failure, Trouble};
use crate::systems::LevelShift;
use crate::theory::terms::Place;
use std::collections::BTreeSet;

/// Most lines of a record; a longer one is for nobody to read.
const MOST_LINES: usize = 2_000;

/// What `paths` has to say.
pub(super) struct PathsReport<'p> {
    pub angular: &'p AngularSum,
    pub shifts: &'p [LevelShift],
    lines: Vec<String>,
}

/// Analyses a sum, restricted to the levels that are moved where some are.
pub(super) fn analysis(
    angular: &AngularSum,
    shifts: &[LevelShift],
    place: Place,
    effort: &Effort,
) -> Result<Analysis, Wrong> {
    let split: BTreeSet<_> = shifts.iter().map(|shift| shift.level.term).collect();
    let split = (!split.is_empty()).then_some(&split);
    analyse(&angular.sum, &angular.setting, split, effort).map_err(|error| {
        use crate::angular::paths::PathError;
        let trouble = match error {
            PathError::Interrupted(stop) => Trouble::from(stop),
            other => {
                let help = other.help().unwrap_or_default().to_string();
                Trouble::Refused { message: other.to_string(), help }
            }
        };
        Failure { place, trouble }.into()
    })
}

/// The answer where nothing is left to analyse.
pub(super) fn nothing_left() -> Answer {
    let verdict = "zero: the terms cancel before any angular algebra";
    lines_answer(vec![format!(": in all: {verdict}")], verdict.to_string(), Vec::new())
}

fn lines_answer(lines: Vec<String>, verdict: String, notes: Vec<String>) -> Answer {
    Answer {
        lines,
        kind: AnswerKind::Paths,
        value: None,
        digits: None,
        unit: None,
        decimal: None,
        verdict,
        notes,
        remarks: Vec::new(),
    }
}

/// The answer of `paths`.
pub(super) fn answer(angular: &AngularSum, shifts: &[LevelShift], analysis: &Analysis) -> Answer {
    let report = PathsReport { angular, shifts, lines: Vec::new() };
    let (lines, verdict) = report.written(analysis);
    let mut notes = Vec::new();
    if angular.beyond_fractions {
        notes.push(
            "a function of H other than a fraction stands in the sum: what is left of a cancellation when levels are split is not shown"
                .into(),
        );
    }
    lines_answer(lines, verdict, notes)
}

impl PathsReport<'_> {
    fn line(&mut self, text: impl AsRef<str>) {
        self.lines.push(format!(": {}", text.as_ref()));
    }

    fn written(mut self, analysis: &Analysis) -> (Vec<String>, String) {
        let several = self.angular.shown.len() > 1;
        if several {
            for (position, text) in self.angular.shown.iter().enumerate() {
                self.line(format!("term {}: {text}", position + 1));
            }
        }
        for text in &self.angular.annihilated {
            self.lines.push(format!(
                ": zero: {text}, where a reduced resolvent stands next to a state of the level it leaves out"
            ));
        }
        for closed in &analysis.closed {
            let term = if several { format!(" for term {}", closed.product + 1) } else { String::new() };
            if closed.broken.is_empty() {
                self.line(format!("no path{term}"));
            }
            for broken in &closed.broken {
                let rules: Vec<&str> = broken.rules.iter().map(|rule| rule.words()).collect();
                self.line(format!(
                    "no path{term}: {} between {} and {}: {}",
                    if broken.operator == IDENTITY { "angular momentum" } else { broken.operator.as_str() },
                    broken.bra,
                    broken.ket,
                    rules.join("; ")
                ));
            }
        }
        for (position, chain) in analysis.chains.iter().enumerate() {
            self.chain(position, chain, &analysis.columns);
        }
        let whole = whole(analysis, self.shifts);
        self.line(format!("in all: {whole}"));
        if self.lines.len() > MOST_LINES {
            let more = self.lines.len() - MOST_LINES;
            let last = self.lines.pop().unwrap_or_default();
            self.lines.truncate(MOST_LINES);
            self.line(format!("… and {more} lines more"));
            self.lines.push(last);
        }
        (self.lines, whole)
    }

    fn chain(&mut self, position: usize, chain: &ChainReport, columns: &Columns) {
        self.line(format!("{}  {}", letters(position), chain.key));
        for (place, text) in spelled(chain, columns) {
            self.line(format!("     {place}{text}"));
        }
        let mut verdict = chain.verdict.sentence();
        let assumption = chain.assumption();
        if !assumption.is_empty() && zero_somewhere(&chain.verdict) {
            verdict += &format!(", where {assumption}");
        }
        self.line(format!("   {verdict}"));
        if !self.angular.beyond_fractions {
            for (places, residual) in grouped(chain, columns) {
                self.residual(&places, residual, chain);
            }
        }
    }

    /// What a cancellation leaves when levels are split.
    fn residual(&mut self, places: &str, residual: &Residual, chain: &ChainReport) {
        let order = match residual.order {
            1 => String::new(),
            order => format!(" in order {order} of the splittings"),
        };
        if let Some(form) = residual.common_form() {
            let times = if residual.forms.len() == 1 { "once more" } else { "once more, each in turn" };
            self.line(format!("   split{places}: {form} times the chain with a resolvent {times}{order}"));
            self.values(form);
            return;
        }
        for raised in &residual.forms {
            let labels: Vec<String> = raised
                .raised
                .iter()
                .map(|place| {
                    let label = &chain.key.brackets[place.bracket].gaps[place.gap][place.resolvent].label;
                    format!("{label} in gap {}", place.gap + 1)
                })
                .collect();
            self.line(format!("   split{places}: {} with {} once more{order}", raised.form, labels.join(" and ")));
            self.values(&raised.form);
        }
    }

    /// The form with the shifts of the session put in, for each set of levels of one n.
    fn values(&mut self, form: &crate::angular::verdict::Form) {
        let mut families: Vec<&str> = self.shifts.iter().map(|shift| shift.family.as_str()).collect();
        families.dedup();
        for family in families {
            let own = self.shifts.iter().filter(|shift| shift.family == family);
            let mut shifts: std::collections::BTreeMap<_, _> =
                own.map(|shift| (shift.level, shift.by.clone())).collect();
            // levels of the term that are not named stay where they are
            for level in form.levels() {
                if self.shifts.iter().any(|shift| shift.family == family && shift.level.term == level.term) {
                    shifts.entry(level).or_default();
                }
            }
            if let Ok(value) = form.value(&shifts) {
                let shown = decimal(&value);
                self.line(format!("     with the levels of {family} as they are moved: {shown} hartree"));
            }
        }
    }
}

/// A splitting to ten digits.
fn decimal(value: &Surd) -> String {
    let scalar = crate::num::Scalar::Exact(value.clone());
    match scalar.to_ball(128) {
        Ok(ball) if !value.is_zero() => crate::num::render::render(&crate::num::Scalar::Approx(ball), 10).text,
        _ => value.to_string(),
    }
}

/// A, B, …, Z, AA, …
fn letters(mut position: usize) -> String {
    let mut out = String::new();
    loop {
        let digit = u8::try_from(position % 26).unwrap_or(0);
        out.insert(0, char::from(b'A' + digit));
        match (position / 26).checked_sub(1) {
            Some(next) => position = next,
            None => return out,
        }
    }
}

/// `M = -1, 1: `
fn at_projections(projections: &[HalfInteger]) -> String {
    let list: Vec<String> = projections.iter().map(HalfInteger::to_string).collect();
    format!("M = {}: ", list.join(", "))
}

/// The sums of a chain spelt out, the M that read the same together.
fn spelled(chain: &ChainReport, columns: &Columns) -> Vec<(String, String)> {
    let projections = columns.projections();
    if projections.is_empty() {
        return chain.spelled(Where::AsWritten, columns).map(|text| (String::new(), text)).into_iter().collect();
    }
    let mut groups: Vec<(Vec<HalfInteger>, String)> = Vec::new();
    for m in projections {
        let Some(text) = chain.spelled(Where::Projection(m), columns) else { continue };
        match groups.iter_mut().find(|(_, known)| *known == text) {
            Some((list, _)) => list.push(m),
            None => groups.push((vec![m], text)),
        }
    }
    let all_alike = groups.len() == 1;
    let mut out: Vec<(String, String)> = groups
        .into_iter()
        .map(|(list, text)| (if all_alike { String::new() } else { at_projections(&list) }, text))
        .collect();
    if !all_alike && let Some(text) = chain.spelled(Where::Average, columns) {
        out.push(("average: ".into(), text));
    }
    out
}

/// Residuals with the places they are alike at.
fn grouped<'c>(chain: &'c ChainReport, columns: &Columns) -> Vec<(String, &'c Residual)> {
    let mut groups: Vec<(Vec<Where>, &Residual)> = Vec::new();
    for (place, residual) in &chain.residuals {
        match groups.iter_mut().find(|(_, known)| *known == residual) {
            Some((list, _)) => list.push(*place),
            None => groups.push((vec![*place], residual)),
        }
    }
    let everywhere = columns.projections().len() + usize::from(!columns.projections().is_empty());
    groups
        .into_iter()
        .map(|(places, residual)| {
            let mut projections = Vec::new();
            let mut average = false;
            for place in &places {
                match place {
                    Where::Projection(m) => projections.push(m.to_string()),
                    Where::Average => average = true,
                    Where::AsWritten => {}
                }
            }
            let mut text = String::new();
            if places.len() < everywhere {
                if !projections.is_empty() {
                    text = format!(", M = {}", projections.join(", "));
                }
                if average {
                    text += if projections.is_empty() { ", average" } else { " and average" };
                }
            }
            (text, residual)
        })
        .collect()
}

fn zero_somewhere(verdict: &Verdict) -> bool {
    !matches!(verdict, Verdict::Survives { .. } | Verdict::NoPath { .. } | Verdict::ProportionalTo { .. })
}

/// The whole sum in words.
fn whole(analysis: &Analysis, shifts: &[LevelShift]) -> String {
    let mut assumed = analysis.chains.iter().flat_map(|chain| chain.equal_levels.keys()).peekable();
    let any_assumed = assumed.peek().is_some();
    let moved = assumed.any(|term| shifts.iter().any(|shift| shift.level.term == *term));
    let but = if moved { " but for the shifts" } else { "" };
    let because = match (moved, any_assumed) {
        (true, _) => "by its angular factors",
        (false, true) => "by its angular factors, where the levels of a term have one energy",
        (false, false) => "by its angular factors alone",
    };
    match analysis.whole() {
        Whole::NoPath => "zero: no path".into(),
        Whole::Zero if analysis.columns.projections().is_empty() => format!("zero{but}, {because}"),
        Whole::Zero => format!("zero for every M{but}, {because}"),
        Whole::ZeroForAskedM => format!("zero for the M that is written{but}, {because}"),
        Whole::ZeroOnAverage => format!("zero in the average over M{but}, {because}"),
        Whole::NotZero => {
            let proportional = analysis.chains.iter().find_map(|chain| match &chain.verdict {
                Verdict::ProportionalTo { which, factor } => Some((which, factor)),
                _ => None,
            });
            match proportional {
                Some((which, factor)) => format!("{factor} times {which}: a zero of {which} does not move"),
                None => "not zero".into(),
            }
        }
    }
}
