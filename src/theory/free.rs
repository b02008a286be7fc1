//! Variables that need no value: `w` in `paths pol(w)`.

use super::names::Names;
use super::terms::function_named;
use super::unit_words::{ends_in_quantity, is_unit};
use crate::lang::tree::{Argument, Expr, ExprKind, Operation, StateRef, StateRefKind};
use std::collections::BTreeSet;

/// The unbound names that stand as arguments of definitions, or beside H in a sum, where nothing but a number can be meant.
///
/// Anywhere else an unbound name is more likely a misprint of an operator.
pub fn free_variables(expr: &Expr, names: &Names) -> Vec<String> {
    let mut search = Search { names, found: BTreeSet::new() };
    search.expr(expr, false);
    search.found.into_iter().collect()
}

struct Search<'n> {
    names: &'n Names,
    found: BTreeSet<String>,
}

impl Search<'_> {
    fn is_free(&self, name: &str) -> bool {
        let base = name.split('_').next().unwrap_or(name);
        !matches!(name, "i" | "pi" | "inf" | "H" | "E")
            && !self.names.bound.contains_key(name)
            && !self.names.broken.contains_key(name)
            && !self.names.later.contains_key(name)
            && !self.names.operators.contains(base)
            && !self.names.matrix_operators.contains(name)
            && function_named(name).is_none()
    }

    /// `number`: only a number can stand here.
    fn expr(&mut self, expr: &Expr, number: bool) {
        match &expr.kind {
            ExprKind::Name(name) if number && self.is_free(name) => {
                self.found.insert(name.clone());
            }
            ExprKind::Binary {
                operation: Operation::Multiply | Operation::Juxtapose | Operation::Divide,
                left,
                right,
            } if is_unit(right) && ends_in_quantity(left) => {
                self.expr(left, number);
            }
            ExprKind::Binary { operation, left, right } => {
                let sum = matches!(operation, Operation::Add | Operation::Subtract);
                let inner = number || sum && names_h(expr);
                self.expr(left, inner);
                self.expr(right, inner);
            }
            ExprKind::Negate(inner) | ExprKind::Primed(inner) => self.expr(inner, number),
            ExprKind::Without { body, .. } => self.expr(body, number),
            ExprKind::Bracket { bra, chain, ket } => {
                self.state(bra);
                self.state(ket);
                if let Some(chain) = chain {
                    self.expr(chain, false);
                }
            }
            ExprKind::Ket(state) | ExprKind::Bra(state) => self.state(state),
            ExprKind::Call { name, arguments, .. } => {
                let defined = self.names.bound.contains_key(&name.text);
                for argument in arguments {
                    if let Argument::Positional(inner) = argument {
                        self.expr(inner, defined);
                    }
                }
            }
            _ => {}
        }
    }

    fn state(&mut self, state: &StateRef) {
        if let StateRefKind::Named { arguments, .. } = &state.kind {
            arguments.iter().for_each(|argument| self.expr(argument, true));
        }
    }
}

/// Whether H is a term of a sum.
fn names_h(expr: &Expr) -> bool {
    match &expr.kind {
        ExprKind::Name(name) => name == "H",
        ExprKind::Binary { left, right, .. } => names_h(left) || names_h(right),
        ExprKind::Negate(inner) | ExprKind::Primed(inner) => names_h(inner),
        _ => false,
    }
}
