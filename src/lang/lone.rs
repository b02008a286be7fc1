//! Bras without kets and kets without bras, where a number is meant.

use super::fault::Fault;
use super::tree::{
    Argument, DefinitionKind, DigitsWanted, Entry, EntryKind, Expr, ExprKind, InspectVerb, Operation, Span,
};

/// Finds the bras and kets of an entry that belong to no bracket, no projector `|a><b|` and no definition of a ket.
///
/// `text` is what the spans point into.
pub(super) fn lone_states(entry: &Entry, text: &str) -> Vec<(Span, Fault)> {
    let mut search = Search { text, kets_allowed: false, troubles: Vec::new() };
    match &entry.kind {
        EntryKind::Digits(DigitsWanted::Count(count)) => search.expr(count),
        EntryKind::Definition { kind, body, .. } => {
            search.kets_allowed = *kind == DefinitionKind::Ket;
            search.expr(body);
        }
        EntryKind::Evaluate { expression, unit } => {
            search.expr(expression);
            unit.iter().for_each(|unit| search.expr(unit));
        }
        EntryKind::Inspect { verb, expression } => {
            search.kets_allowed = matches!(verb, InspectVerb::Formula);
            search.expr(expression);
        }
        EntryKind::Paths { expression, beside } => {
            search.expr(expression);
            beside.iter().for_each(|beside| search.expr(beside));
        }
        EntryKind::Compare { left, right } | EntryKind::Expect { left, right } => {
            search.expr(left);
            search.expr(right);
        }
        EntryKind::Sweep { from, to, step, columns, .. } => {
            [from, to, step].into_iter().chain(columns).for_each(|value| search.expr(value));
        }
        EntryKind::Converge { expression, values, .. } => {
            search.expr(expression);
            values.iter().for_each(|value| search.expr(value));
        }
        EntryKind::Budget { lines, .. } => lines.iter().for_each(|line| search.expr(&line.value)),
        EntryKind::System { arguments, .. } => search.arguments(arguments),
        EntryKind::Digits(DigitsWanted::Exact)
        | EntryKind::Constants(_)
        | EntryKind::State { .. }
        | EntryKind::Manifold { .. } => {}
    }
    search.troubles
}

struct Search<'t> {
    text: &'t str,
    kets_allowed: bool,
    troubles: Vec<(Span, Fault)>,
}

impl Search<'_> {
    fn quoted(&self, span: Span) -> String {
        self.text.get(span.start..span.end).unwrap_or_default().to_owned()
    }

    fn ket(&mut self, span: Span) {
        if !self.kets_allowed {
            self.troubles.push((span, Fault::LoneKet(self.quoted(span))));
        }
    }

    fn bra(&mut self, span: Span) {
        self.troubles.push((span, Fault::LoneBra(self.quoted(span))));
    }

    fn expr(&mut self, expr: &Expr) {
        match &expr.kind {
            ExprKind::Ket(_) => self.ket(expr.span),
            ExprKind::Bra(_) => self.bra(expr.span),
            ExprKind::Binary { operation: Operation::Juxtapose | Operation::Multiply, .. } => self.product(expr),
            ExprKind::Binary { left, right, .. } => {
                self.expr(left);
                self.expr(right);
            }
            ExprKind::Negate(inner) | ExprKind::Primed(inner) => self.expr(inner),
            ExprKind::Without { body, .. } => self.expr(body),
            ExprKind::Bracket { chain: Some(chain), .. } => {
                let allowed = std::mem::replace(&mut self.kets_allowed, false);
                self.expr(chain);
                self.kets_allowed = allowed;
            }
            ExprKind::Call { arguments, .. } => {
                let allowed = std::mem::replace(&mut self.kets_allowed, false);
                self.arguments(arguments);
                self.kets_allowed = allowed;
            }
            ExprKind::List(elements) => elements.iter().for_each(|element| self.expr(element)),
            ExprKind::Number(_)
            | ExprKind::Measured { .. }
            | ExprKind::Name(_)
            | ExprKind::Member { .. }
            | ExprKind::Text(_)
            | ExprKind::Labelled { .. }
            | ExprKind::Bracket { chain: None, .. } => {}
        }
    }

    /// Walks the factors from left to right: a ket directly followed by a bra is a projector.
    fn product(&mut self, product: &Expr) {
        let mut factors = Vec::new();
        let mut rest = product;
        while let ExprKind::Binary { operation: Operation::Juxtapose | Operation::Multiply, left, right } = &rest.kind {
            factors.push(right.as_ref());
            rest = left;
        }
        factors.push(rest);
        let mut ket = None;
        for factor in factors.into_iter().rev() {
            match (&factor.kind, ket.take()) {
                (ExprKind::Bra(_), Some(_)) => {}
                (ExprKind::Ket(_), None) => ket = Some(factor.span),
                (ExprKind::Ket(_), Some(before)) => {
                    self.ket(before);
                    ket = Some(factor.span);
                }
                (_, before) => {
                    before.into_iter().for_each(|span| self.ket(span));
                    self.expr(factor);
                }
            }
        }
        ket.into_iter().for_each(|span| self.ket(span));
    }

    fn arguments(&mut self, arguments: &[Argument]) {
        for argument in arguments {
            match argument {
                Argument::Positional(value) | Argument::Named { value, .. } | Argument::Level { value, .. } => {
                    self.expr(value);
                }
                Argument::Range { from, to, .. } => {
                    self.expr(from);
                    self.expr(to);
                }
                Argument::At { point, .. } => self.expr(point),
            }
        }
    }
}
