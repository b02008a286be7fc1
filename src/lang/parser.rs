//! Text to tree: the whole of one entry, or one expression.

use nom::Err;

use super::diagnostic::Diagnostic;
use super::extent;
use super::fault::{Fault, Found};
use super::lexis::{LONGEST_ENTRY, Reading, blanks, found, word_text};
use super::lone::lone_states;
use super::spelling::{Spelling, spell};
use super::tree::{Entry, Expr, Span};
use super::trouble::{Parsed, Reason, Trouble, WantedSet};
use super::vocabulary::{self, WordKind};

/// The most diagnostics of one entry.
const MOST_DIAGNOSTICS: usize = 10;

/// Reads one entry. Spans are bytes of `text`.
///
/// *Errors*: what is wrong, where, and what to write instead; never a panic, whatever the text.
/// *Cost*: proportional to the length of the text.
pub fn parse_entry(text: &str) -> Result<Entry, Vec<Diagnostic>> {
    check_length(text)?;
    if let Some(second) = extent::second_entry(text) {
        let end = second + text[second..].lines().next().map_or(0, |line| line.trim_end().len());
        return Err(vec![Fault::SecondEntry.diagnostic(Span::new(second, end))]);
    }
    let (mut entry, spelling) = read(text, |reading| reading.entry())?;
    let troubles = lone_states(&entry, &spelling.text);
    if !troubles.is_empty() {
        let told = troubles.into_iter().take(MOST_DIAGNOSTICS);
        return Err(told.map(|(span, fault)| restore(&spelling, fault.diagnostic(span))).collect());
    }
    entry.for_each_span(&mut |span| *span = spelling.original_span(*span));
    Ok(entry)
}

/// Reads one expression. Spans are bytes of `text`.
///
/// *Errors*: as `parse_entry`; kets without bras are let pass.
pub fn parse_expression(text: &str) -> Result<Expr, Vec<Diagnostic>> {
    check_length(text)?;
    let (mut expression, spelling) = read(text, |reading| reading.lone_expression())?;
    expression.for_each_span(&mut |span| *span = spelling.original_span(*span));
    Ok(expression)
}

fn check_length(text: &str) -> Result<(), Vec<Diagnostic>> {
    if text.len() <= LONGEST_ENTRY {
        return Ok(());
    }
    let first = text.chars().next().map_or(0, char::len_utf8);
    let fault = Fault::EntryTooLong { bytes: text.len(), limit: LONGEST_ENTRY };
    Err(vec![fault.diagnostic(Span::new(0, first))])
}

fn read<T>(
    text: &str,
    parser: impl for<'a> FnOnce(&Reading<'a>) -> Parsed<'a, T>,
) -> Result<(T, Spelling), Vec<Diagnostic>> {
    let spelling = spell(text).map_err(|(span, fault)| vec![fault.diagnostic(span)])?;
    let reading = Reading::new(&spelling.text);
    let diagnostic = match parser(&reading) {
        Ok((_, tree)) => return Ok((tree, spelling)),
        Err(Err::Error(trouble) | Err::Failure(trouble)) => explain(&reading, trouble),
        Err(Err::Incomplete(_)) => Fault::EmptyEntry.diagnostic(Span::new(0, 0)),
    };
    Err(vec![restore(&spelling, diagnostic)])
}

fn explain(reading: &Reading<'_>, trouble: Trouble) -> Diagnostic {
    let text = reading.text();
    let mut diagnostic = explain_place(text, reading, trouble);
    if diagnostic.help.is_none() {
        diagnostic.help = form_of_entry(text);
    }
    diagnostic
}

/// Says how the entry is written whose word begins the text.
fn form_of_entry(text: &str) -> Option<String> {
    let (_, word) = word_text(blanks(text)).ok()?;
    let page = vocabulary::vocabulary().find(word).filter(|page| page.kind == WordKind::Entry)?;
    Some(format!("the entry is written `{}`", page.signature.replace(" | ", "` or `")))
}

fn explain_place(text: &str, reading: &Reading<'_>, trouble: Trouble) -> Diagnostic {
    let start = text.len() - trouble.left.min(text.len());
    let rest = &text[start..];
    match trouble.reason {
        Reason::Fault(fault) => {
            let end = text.len() - trouble.left_after.min(text.len());
            // Nothing can be underlined behind the end; the mark goes behind the last thing written.
            let place = if rest.is_empty() { text.trim_end().len().max(end.min(start)).min(start) } else { start };
            fault.diagnostic(Span::new(place, end.max(place)))
        }
        Reason::Wanted(wanted) => {
            let wanted = wanted.joined(reading.wanted_at(trouble.left));
            let found = found(rest);
            let length = match &found {
                Found::EndOfEntry => 0,
                Found::Token(token) => token.len(),
            };
            let fault = match &found {
                Found::Token(token) if only_end_is_wanted(wanted) => Fault::CannotFollow(token.clone()),
                _ => Fault::Wanted { wanted, found },
            };
            fault.diagnostic(Span::new(start, start + length))
        }
    }
}

fn only_end_is_wanted(wanted: WantedSet) -> bool {
    wanted.members().all(|wanted| wanted == super::trouble::Wanted::EndOfEntry)
}

fn restore(spelling: &Spelling, mut diagnostic: Diagnostic) -> Diagnostic {
    diagnostic.span = spelling.original_span(diagnostic.span);
    for (span, _) in &mut diagnostic.related {
        *span = spelling.original_span(*span);
    }
    diagnostic
}

#[cfg(test)]
mod tests {
    use super::*;

    fn printed(text: &str) -> String {
        match parse_entry(text) {
            Ok(entry) => entry.to_string(),
            Err(found) => found.iter().map(|found| format!("! {}", found.message)).collect(),
        }
    }

    /// The expression with every operation in brackets, to see how it binds.
    fn bound(text: &str) -> String {
        fn show(expr: &Expr) -> String {
            use super::super::tree::{ExprKind, Operation};
            match &expr.kind {
                ExprKind::Binary { operation, left, right } => {
                    let sign = match operation {
                        Operation::Add => "+",
                        Operation::Subtract => "-",
                        Operation::Multiply => "*",
                        Operation::Juxtapose => " ",
                        Operation::Divide => "/",
                        Operation::Power => "^",
                    };
                    format!("({}{sign}{})", show(left), show(right))
                }
                ExprKind::Negate(inner) => format!("(-{})", show(inner)),
                ExprKind::Primed(inner) => format!("({}')", show(inner)),
                ExprKind::Without { body, manifold } => format!("({} without {manifold})", show(body)),
                _ => expr.to_string(),
            }
        }
        parse_expression(text).map_or_else(|found| format!("! {}", found[0].message), |expr| show(&expr))
    }

    #[test]
    fn operators_bind_as_on_paper() {
        for (text, tree) in [
            ("1/2 x", "((1/2) x)"),
            ("1/8 p^4", "((1/8) (p^4))"),
            ("-1/8 p^4", "(-((1/8) (p^4)))"),
            ("-2 <g|D_z|g>", "(-(2 <g| D_z |g>))"),
            ("a^-2", "(a^(-2))"),
            ("a^(1/2)", "(a^(1/2))"),
            ("a^b^c", "(a^(b^c))"),
            ("a^-b^c", "(a^(-(b^c)))"),
            ("-a^2", "(-(a^2))"),
            ("a - b - c", "((a-b)-c)"),
            ("a - -b", "(a-(-b))"),
            ("a * -b c", "((a*(-b)) c)"),
            ("1/(E(g)-H)'", "(1/((E(g)-H)'))"),
            ("(E(g)-H)'^2", "(((E(g)-H)')^2)"),
            ("1/(E(g) - H) without P", "((1/(E(g)-H)) without P)"),
            ("a + 1/H without P + b", "((a+((1/H) without P))+b)"),
            ("2 pi (x + 1)", "((2 pi) (x+1))"),
            ("a (b)", "(a b)"),
            ("a(b)", "a(b)"),
            ("x^2(3)", "((x^2) 3)"),
            ("725(3) MHz", "(725(3) MHz)"),
            ("725 +- 3 MHz", "(725(3) MHz)"),
            ("D_+1 D_-1 C(2)_0 C(1)_-1", "(((D_+1 D_-1) C(2)_0) C(1)_-1)"),
            ("<g|A|g> <g|B|g>", "(<g| A |g> <g| B |g>)"),
            ("2p", "(2 p)"),
            ("2 e - 3", "((2 e)-3)"),
            ("|a><a| V", "! the bracket has a bra and no ket"),
            ("1 000", "! two numbers stand side by side"),
        ] {
            assert_eq!(bound(text), tree, "{text}");
        }
    }

    #[test]
    fn brackets_read_as_on_paper() {
        for text in [
            "<g| D_z R(w) (V - <g| W |g>) R(w) D_z |g>",
            "<g|u(w)>",
            "<h[2p, m=1]|h[{n}p, m=m]>",
            "<u(w)| V |u(-w)>",
            "ket u(w) = R(w) D_z |g>",
            "operator A = |a><a|",
            "operator A = (|a><a|) V (|b><b|) - V",
            "sum(n in 1 .. 20, <g| D_z |h[{n}p]>^2/(E(g) - E(h[{n}p])))",
        ] {
            assert_eq!(printed(text), text);
        }
        assert_eq!(printed("<a||b>"), "<a|b>");
        assert_eq!(printed("⟨g| D_z² |g⟩"), "<g| D_z^2 |g>");
    }

    #[test]
    fn uncertainties_are_spelt_out() {
        use super::super::tree::ExprKind;
        for (text, value, uncertainty) in [
            ("1.5(2)", "1.5", "0.2"),
            ("725(3)", "725", "3"),
            ("1.50(25)e3", "1.50e3", "0.25e3"),
            ("0.00012(345)", "0.00012", "0.00345"),
            ("725 ± 0.5", "725", "0.5"),
        ] {
            let wanted = ExprKind::Measured { value: value.to_owned(), uncertainty: uncertainty.to_owned() };
            assert_eq!(parse_expression(text).map(|expr| expr.kind), Ok(wanted), "{text}");
        }
    }

    #[test]
    fn hostile_text_is_refused_and_never_a_crash() {
        let many = 100_000;
        for text in [
            "(".repeat(many),
            "[".repeat(many),
            "f(".repeat(many),
            "f([".repeat(many),
            "<a|".repeat(many),
            "-".repeat(many),
            "2^".repeat(many),
            "2^-".repeat(many),
            "a*-".repeat(many),
            format!("x{}", "'".repeat(many)),
            format!("x{}", "^2".repeat(many)),
            "h[{".repeat(many),
            "|u(".repeat(many),
            "<u(".repeat(many),
            "a without P ".repeat(many),
            format!("x{}", " without P".repeat(many)),
            "1+".repeat(many) + "1",
            "a ".repeat(many),
            "|a>".repeat(many),
            "a.b.".repeat(many),
            "f(a{".repeat(many),
            format!("1e{}", "9".repeat(many)),
            "9".repeat(2 * many),
            "x".repeat(2_000_000),
            "\0".to_owned(),
            "a \u{1b}[31m".to_owned(),
        ] {
            let start: String = text.chars().take(12).collect();
            let found = parse_entry(&text);
            assert!(found.is_err_and(|found| !found.is_empty()), "{start}");
        }
        assert!(parse_entry(&"9".repeat(100_000)).is_ok());
        assert!(parse_entry(&"|a> + ".repeat(10_000)).is_err_and(|found| found.len() <= MOST_DIAGNOSTICS));
        assert!(parse_entry("1e100000").is_ok() && parse_entry("1e100001").is_err());
    }

    #[test]
    fn spans_point_into_the_text_given() {
        use super::super::tree::ExprKind;
        let text = "  ω + ⟨g| V |g⟩  # sum";
        let Ok(entry) = parse_entry(text) else { unreachable!("a good entry") };
        assert_eq!(&text[entry.span.start..entry.span.end], "ω + ⟨g| V |g⟩");
        let Ok(sum) = parse_expression("ω + ⟨g| V |g⟩") else { unreachable!("a good expression") };
        let ExprKind::Binary { left, right, .. } = sum.kind else { unreachable!("a sum") };
        assert_eq!((left.span, right.span), (Span::new(0, 2), Span::new(5, 18)));
    }
}
