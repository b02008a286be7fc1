//! Walking over the spans of a tree: to move them, and to compare trees apart from them.

use super::tree::{
    Argument, BudgetLine, DigitsWanted, Entry, EntryKind, Expr, ExprKind, Label, LabelPart, Name, Span, StateRef,
    StateRefKind,
};

type Visit<'v> = &'v mut dyn FnMut(&mut Span);

impl Entry {
    /// Says whether two entries mean the same, wherever they stand.
    pub fn same_as(&self, other: &Entry) -> bool {
        self.without_spans() == other.without_spans()
    }

    /// Copies the entry with every span set to zero.
    #[must_use]
    pub fn without_spans(&self) -> Entry {
        let mut copy = self.clone();
        copy.for_each_span(&mut |span| *span = Span::default());
        copy
    }

    /// Shows every span of the entry to `visit`, which may move it.
    pub fn for_each_span(&mut self, visit: Visit<'_>) {
        visit(&mut self.span);
        walk_entry(&mut self.kind, visit);
    }
}

impl Expr {
    /// Says whether two expressions are the same tree, wherever they stand.
    pub fn same_as(&self, other: &Expr) -> bool {
        self.without_spans() == other.without_spans()
    }

    /// Copies the expression with every span set to zero.
    #[must_use]
    pub fn without_spans(&self) -> Expr {
        let mut copy = self.clone();
        copy.for_each_span(&mut |span| *span = Span::default());
        copy
    }

    /// Shows every span of the expression to `visit`, which may move it.
    pub fn for_each_span(&mut self, visit: Visit<'_>) {
        walk_expr(self, visit);
    }
}

fn walk_entry(kind: &mut EntryKind, visit: Visit<'_>) {
    match kind {
        EntryKind::Digits(DigitsWanted::Exact) => {}
        EntryKind::Digits(DigitsWanted::Count(count)) => walk_expr(count, visit),
        EntryKind::Constants(name) => walk_name(name, visit),
        EntryKind::System { name, kind, arguments } => {
            walk_name(name, visit);
            walk_name(kind, visit);
            arguments.iter_mut().for_each(|item| walk_argument(item, visit));
        }
        EntryKind::State { name, system, label } | EntryKind::Manifold { name, system, label } => {
            walk_name(name, visit);
            walk_name(system, visit);
            walk_label(label, visit);
        }
        EntryKind::Definition { kind: _, name, parameters, body } => {
            walk_name(name, visit);
            parameters.iter_mut().for_each(|item| walk_name(item, visit));
            walk_expr(body, visit);
        }
        EntryKind::Evaluate { expression, unit } => {
            walk_expr(expression, visit);
            unit.iter_mut().for_each(|item| walk_expr(item, visit));
        }
        EntryKind::Inspect { verb: _, expression } => walk_expr(expression, visit),
        EntryKind::Paths { expression, beside } => {
            walk_expr(expression, visit);
            beside.iter_mut().for_each(|beside| walk_expr(beside, visit));
        }
        EntryKind::Compare { left, right } | EntryKind::Expect { left, right } => {
            walk_expr(left, visit);
            walk_expr(right, visit);
        }
        EntryKind::Sweep { variable, from, to, step, columns } => {
            walk_name(variable, visit);
            [from, to, step].into_iter().chain(columns).for_each(|item| walk_expr(item, visit));
        }
        EntryKind::Converge { expression, system, field, values } => {
            walk_expr(expression, visit);
            walk_name(system, visit);
            walk_name(field, visit);
            values.iter_mut().for_each(|item| walk_expr(item, visit));
        }
        EntryKind::Budget { title: _, unit, lines } => {
            unit.iter_mut().for_each(|item| walk_expr(item, visit));
            for BudgetLine { label: _, value } in lines {
                walk_expr(value, visit);
            }
        }
    }
}

fn walk_expr(expr: &mut Expr, visit: Visit<'_>) {
    visit(&mut expr.span);
    match &mut expr.kind {
        ExprKind::Number(_) | ExprKind::Measured { .. } | ExprKind::Name(_) | ExprKind::Text(_) => {}
        ExprKind::Member { owner, field } => {
            walk_name(owner, visit);
            walk_name(field, visit);
        }
        ExprKind::List(elements) => elements.iter_mut().for_each(|item| walk_expr(item, visit)),
        ExprKind::Call { name, arguments, subscript: _ } => {
            walk_name(name, visit);
            arguments.iter_mut().for_each(|item| walk_argument(item, visit));
        }
        ExprKind::Labelled { system, label } => {
            walk_name(system, visit);
            walk_label(label, visit);
        }
        ExprKind::Negate(inner) | ExprKind::Primed(inner) => walk_expr(inner, visit),
        ExprKind::Binary { operation: _, left, right } => {
            walk_expr(left, visit);
            walk_expr(right, visit);
        }
        ExprKind::Without { body, manifold } => {
            walk_expr(body, visit);
            walk_name(manifold, visit);
        }
        ExprKind::Bracket { bra, chain, ket } => {
            walk_state(bra, visit);
            chain.iter_mut().for_each(|chain| walk_expr(chain, visit));
            walk_state(ket, visit);
        }
        ExprKind::Ket(state) | ExprKind::Bra(state) => walk_state(state, visit),
    }
}

fn walk_argument(argument: &mut Argument, visit: Visit<'_>) {
    match argument {
        Argument::Positional(value) => walk_expr(value, visit),
        Argument::Named { name, value } => {
            walk_name(name, visit);
            walk_expr(value, visit);
        }
        Argument::Range { variable, from, to } => {
            walk_name(variable, visit);
            walk_expr(from, visit);
            walk_expr(to, visit);
        }
        Argument::At { variable, point } => {
            walk_name(variable, visit);
            walk_expr(point, visit);
        }
        Argument::Level { label, value } => {
            walk_label(label, visit);
            walk_expr(value, visit);
        }
    }
}

fn walk_state(state: &mut StateRef, visit: Visit<'_>) {
    visit(&mut state.span);
    match &mut state.kind {
        StateRefKind::Named { name, arguments } => {
            walk_name(name, visit);
            arguments.iter_mut().for_each(|item| walk_expr(item, visit));
        }
        StateRefKind::Labelled { system, label } => {
            walk_name(system, visit);
            walk_label(label, visit);
        }
    }
}

fn walk_label(label: &mut Label, visit: Visit<'_>) {
    visit(&mut label.span);
    for part in &mut label.parts {
        if let LabelPart::Computed(value) = part {
            walk_expr(value, visit);
        }
    }
    for (name, value) in &mut label.options {
        walk_name(name, visit);
        walk_expr(value, visit);
    }
}

fn walk_name(name: &mut Name, visit: Visit<'_>) {
    visit(&mut name.span);
}
