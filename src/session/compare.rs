//! What `compare` and `expect` say of two values.

use super::outcome::{Answer, AnswerKind};
use crate::lang::tree::{Expr, ExprKind};
use crate::num::render::{Agreement, RenderedKind, digits_in_common, render};
use crate::num::{Scalar, decimal};
use crate::sums::{Value, bits_for, brief};
use crate::theory::unit_words::number_of_quantity;
use rug::{Float, Rational};

/// `compare A with B`: equal, or both values with difference, ratio and digits in common.
pub(super) fn comparison(a: &Value, b: &Value, digits: u32, unit: Option<&str>) -> Answer {
    let bits = bits_for(digits) + 64;
    let mut answer = Answer {
        lines: Vec::new(),
        kind: AnswerKind::Comparison,
        value: None,
        digits: None,
        unit: unit.map(str::to_string),
        decimal: None,
        verdict: "different".into(),
        notes: Vec::new(),
        remarks: Vec::new(),
    };
    let show = |scalar: &Scalar| in_unit(&marked(scalar, digits), unit);
    if a.sigma().is_some() || b.sigma().is_some() {
        // What is left to say, the distance in standard uncertainties, needs the difference with shared sources cancelled.
        answer.kind = AnswerKind::Comparison;
        answer.verdict = "uncertain".into();
        for (side, value) in [("left", a), ("right", b)] {
            let shown = match value.sigma() {
                Some(sigma) => in_unit(&format!("~ {}", super::evaluate::concise(&value.scalar, &sigma)), unit),
                None => show(&value.scalar),
            };
            answer.lines.push(format!(": {side} {shown}"));
        }
        return answer;
    }
    if let (Scalar::Exact(x), Scalar::Exact(y)) = (&a.scalar, &b.scalar)
        && x == y
    {
        answer.lines.push(in_unit(&format!("= equal: {x}"), unit));
        answer.value = Some(x.to_string());
        answer.verdict = "equal".into();
        return answer;
    }
    if let Agreement::BothBelow { power } = digits_in_common(&a.scalar, &b.scalar) {
        answer.lines.push(in_unit(&format!("~ both 0 below 1e-{power}, not proved"), unit));
        answer.verdict = "zero, not proved".into();
        return answer;
    }
    let common = common_digits(&a.scalar, &b.scalar, digits);
    if common >= digits {
        let rendered = render(&a.scalar, digits);
        answer.lines.push(in_unit(&format!("~ equal to {digits} digits: {}", rendered.text), unit));
        answer.value = Some(rendered.text);
        answer.digits = Some(digits);
        answer.verdict = "equal".into();
        return answer;
    }
    answer.lines.push(format!(": left {}", show(&a.scalar)));
    answer.lines.push(format!(": right {}", show(&b.scalar)));
    if let Ok(difference) = a.scalar.sub(&b.scalar, bits) {
        answer.lines.push(format!(": difference {}", in_unit(&marked(&difference, digits.min(10)), unit)));
    }
    if let Ok(ratio) = a.scalar.div(&b.scalar, bits) {
        answer.lines.push(format!(": ratio {}", marked(&ratio, digits.min(20))));
    }
    answer.lines.push(format!(": {common} digits in common"));
    answer.digits = Some(common);
    answer
}

/// Adds the distance in standard uncertainties to a comparison of values that have them.
pub(super) fn add_distance(answer: &mut Answer, difference: &Value, unit: Option<&str>) {
    let Some(sigma) = difference.sigma().filter(|sigma| !sigma.is_zero()) else {
        let shown = in_unit(&marked(&difference.scalar, 10), unit);
        answer.lines.push(format!(": difference {shown}: both rest on the same sources"));
        return;
    };
    let shown = in_unit(&format!("~ {}", super::evaluate::concise(&difference.scalar, &sigma)), unit);
    answer.lines.push(format!(": difference {shown}"));
    let Ok(ball) = difference.scalar.to_ball(128) else { return };
    let distance = Float::with_val(64, ball.re.mid() / sigma).abs();
    answer.lines.push(format!(": {} standard uncertainties apart", brief(&distance)));
}

/// Digits in which two values agree, at most the number asked.
fn common_digits(a: &Scalar, b: &Scalar, digits: u32) -> u32 {
    match digits_in_common(a, b) {
        Agreement::Equal => digits,
        Agreement::Digits(common) => common.min(digits),
        Agreement::SignsDiffer | Agreement::BothBelow { .. } => 0,
    }
}

/// A line with the unit behind its number, where there is a unit.
fn in_unit(line: &str, unit: Option<&str>) -> String {
    match (unit.filter(|unit| !unit.is_empty()), line.rsplit_once(": ")) {
        (None, _) => line.to_string(),
        (Some(unit), None) => super::quantities::with_unit(line, unit),
        (Some(unit), Some((words, number))) => {
            let number = super::quantities::with_unit(&format!("= {number}"), unit);
            format!("{words}: {}", number.trim_start_matches("= "))
        }
    }
}

pub(super) fn marked(scalar: &Scalar, digits: u32) -> String {
    let rendered = render(scalar, digits);
    match rendered.kind {
        RenderedKind::Exact => format!("= {}", rendered.text),
        _ => format!("~ {}", rendered.text),
    }
}

/// `expect A = B`. A decimal on the right is met when the value rounds to it, a value with an uncertainty within that
/// uncertainty, anything else exactly or to the digits asked.
///
/// Errors: the sentence that says what came out instead.
pub(super) fn expectation(
    a: &Value,
    b: &Value,
    written: &Expr,
    digits: u32,
    unit: Option<&str>,
) -> Result<Answer, String> {
    let bits = bits_for(digits) + 64;
    let met = |line: String, digits: Option<u32>| Answer {
        lines: vec![line],
        kind: AnswerKind::Expectation,
        value: None,
        digits,
        unit: None,
        decimal: None,
        verdict: "holds".into(),
        notes: Vec::new(),
        remarks: Vec::new(),
    };
    if let (Scalar::Exact(x), Scalar::Exact(y)) = (&a.scalar, &b.scalar)
        && a.sigma().is_none()
        && b.sigma().is_none()
        && x == y
    {
        return Ok(met("= holds".into(), None));
    }
    let missed = || {
        let shown = |value: &Value| {
            let line = match value.sigma() {
                Some(sigma) => format!("~ {}", super::evaluate::concise(&value.scalar, &sigma)),
                None if unit.is_some() => super::quantities::marked_decimal(&value.scalar, digits),
                None => marked(&value.scalar, digits),
            };
            in_unit(&line, unit).trim_start_matches(['=', '~', ' ']).to_string()
        };
        format!("expected {}, and the value is {}", shown(b), shown(a))
    };
    let difference = a.scalar.sub(&b.scalar, bits).and_then(|d| d.to_ball(bits)).map_err(|_| missed())?;
    let distance = difference.magnitude_above();
    if let Some(unit) = last_place(written) {
        // Rounded to the digits written, the value is the one written.
        let allowed = Float::with_val(64, unit / 2u32) + joined_sigma(a, b).unwrap_or_else(|| Float::new(64));
        return if distance <= allowed { Ok(met("~ holds to the digits written".into(), None)) } else { Err(missed()) };
    }
    if let Some(sigma) = joined_sigma(a, b) {
        return if distance <= sigma { Ok(met("~ holds within the uncertainty".into(), None)) } else { Err(missed()) };
    }
    if a.scalar.is_exact() && b.scalar.is_exact() {
        return Err(missed());
    }
    let common = common_digits(&a.scalar, &b.scalar, digits);
    if common >= digits {
        Ok(met(format!("~ holds to {digits} digits"), Some(digits)))
    } else {
        Err(format!("{}: {common} digits in common", missed()))
    }
}

/// The uncertainty of the difference of two independent values.
fn joined_sigma(a: &Value, b: &Value) -> Option<Float> {
    match (a.sigma(), b.sigma()) {
        (None, None) => None,
        (Some(one), None) | (None, Some(one)) => Some(one),
        (Some(one), Some(other)) => Some(one.hypot(&other)),
    }
}

/// One unit of the last digit of a number written as a decimal.
fn last_place(written: &Expr) -> Option<Rational> {
    match &written.kind {
        ExprKind::Negate(inner) => last_place(inner),
        ExprKind::Number(text) => {
            let (mantissa, exponent) = match text.split_once(['e', 'E']) {
                Some((mantissa, exponent)) => (mantissa, exponent.parse::<i32>().ok()?),
                None => (text.as_str(), 0),
            };
            let (_, fraction) = mantissa.split_once('.')?;
            let place = exponent.checked_sub(i32::try_from(fraction.len()).ok()?)?;
            decimal::parse_decimal(&format!("1e{place}")).ok()
        }
        // The value is compared in the unit.
        _ => number_of_quantity(written).and_then(last_place),
    }
}
