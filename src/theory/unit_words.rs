//! Units as they stand in a tree, before names have a meaning: which factors are made of unit words, and what they belong to.

use crate::lang::tree::{Expr, ExprKind, Operation};
use crate::num::units::{Lookup, look_up};

fn is_product(operation: Operation) -> bool {
    matches!(operation, Operation::Multiply | Operation::Juxtapose | Operation::Divide)
}

/// Whether an expression is made of unit words: `MHz`, `C m^2/V`.
pub fn is_unit(expr: &Expr) -> bool {
    match &expr.kind {
        ExprKind::Name(name) => matches!(look_up(name), Lookup::Word(_)),
        ExprKind::Binary { operation: Operation::Power, left, .. } => is_unit(left),
        ExprKind::Binary { operation, left, right } if is_product(*operation) => is_unit(left) && is_unit(right),
        _ => false,
    }
}

/// The number of a number with a unit, `3 C m^2/V`.
pub fn number_of_quantity(expr: &Expr) -> Option<&Expr> {
    match &expr.kind {
        ExprKind::Binary { operation, left, right } if is_product(*operation) && is_unit(right) => match left.kind {
            ExprKind::Number(_) | ExprKind::Measured { .. } => Some(left),
            _ => number_of_quantity(left),
        },
        _ => None,
    }
}

/// Whether the last factors of a product are a number with or without a unit.
pub(super) fn ends_in_quantity(expr: &Expr) -> bool {
    match &expr.kind {
        ExprKind::Number(_) | ExprKind::Measured { .. } => true,
        ExprKind::Binary { operation, left, right } if is_product(*operation) => {
            ends_in_quantity(right) || is_unit(right) && ends_in_quantity(left)
        }
        _ => false,
    }
}

#[cfg(test)]
mod tests {
    use super::*;
    use crate::lang::parser::parse_expression;

    #[test]
    fn numbers_have_their_units() {
        for (text, number) in [("3 C m^2/V", Some("3")), ("1.5(2) MHz", Some("1.5(2)")), ("3 x", None), ("x MHz", None)]
        {
            let tree = parse_expression(text).expect(text);
            assert_eq!(number_of_quantity(&tree).map(ToString::to_string).as_deref(), number, "{text}");
        }
        assert!(is_unit(&parse_expression("C m^2/V").expect("a unit")));
    }
}
