//! Units as they stand in a tree, before names have a meaning: which factors are made of unit words, and what they belong to.

use crate::lang::tree::{Expr, ExprKind, Operation, Span};
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

/// A product with every number and the units behind it taken together: `x 3 GHz` is x (3 GHz).
pub(super) fn grouped(expr: &Expr) -> Expr {
    let mut factors = Vec::new();
    let mut rest = expr;
    while let ExprKind::Binary { operation, left, right } = &rest.kind {
        if !is_product(*operation) {
            break;
        }
        factors.push((*operation, right.as_ref().clone()));
        rest = left;
    }
    factors.push((Operation::Juxtapose, rest.clone()));
    let mut product: Option<Expr> = None;
    let mut last: Option<(Operation, Expr)> = None;
    let joined = |product: Option<Expr>, (operation, factor): (Operation, Expr)| match product {
        None => factor,
        Some(product) => binary(operation, product, factor),
    };
    for (operation, factor) in factors.into_iter().rev() {
        last = match last {
            Some((before, quantity))
                if is_unit(&factor)
                    && before != Operation::Divide
                    && (matches!(quantity.kind, ExprKind::Number(_) | ExprKind::Measured { .. })
                        || number_of_quantity(&quantity).is_some()) =>
            {
                Some((before, binary(operation, quantity, factor)))
            }
            Some(done) => {
                product = Some(joined(product, done));
                Some((operation, factor))
            }
            None => Some((operation, factor)),
        };
    }
    match last {
        Some(done) => joined(product, done),
        None => expr.clone(),
    }
}

fn binary(operation: Operation, left: Expr, right: Expr) -> Expr {
    let span: Span = left.span.to(right.span);
    Expr { kind: ExprKind::Binary { operation, left: Box::new(left), right: Box::new(right) }, span }
}

#[cfg(test)]
mod tests {
    use super::*;
    use crate::lang::parser::parse_expression;

    #[test]
    fn numbers_keep_their_units() {
        for (text, shown) in [
            ("x 3 GHz", "x (3 GHz)"),
            ("3 C m^2/V x", "3 C m^2/V x"),
            ("2 x 4 V/cm y", "2 x (4 V/cm) y"),
            ("1/3 GHz", "1/3 GHz"),
            ("x y", "x y"),
        ] {
            let tree = parse_expression(text).expect(text);
            assert_eq!(grouped(&tree).to_string(), shown, "{text}");
        }
        let tree = parse_expression("3 C m^2/V").expect("an expression");
        assert!(number_of_quantity(&tree).is_some() && is_unit(&parse_expression("C m^2/V").expect("a unit")));
    }
}
