//! Turns faults of meaning and failed evaluations into diagnostics: the span is added here, at the boundary.

use super::evaluate::Wrong;
use crate::lang::diagnostic::Diagnostic;
use crate::lang::tree::Span;
use crate::theory::Fault;
use crate::theory::terms::Place;

/// The diagnostic of a wrong entry, and the place of its cause.
pub(super) fn report_of(wrong: &Wrong) -> (Place, Diagnostic) {
    match wrong {
        Wrong::Meaning(problem) => (problem.place, diagnostic_of_fault(problem.place.span, &problem.fault)),
        Wrong::Evaluation(failure) => {
            let trouble = &failure.trouble;
            let mut diagnostic = Diagnostic::new(failure.place.span, trouble.to_string()).with_label(trouble.label());
            diagnostic.help = trouble.help();
            (failure.place, diagnostic)
        }
    }
}

/// The diagnostic of a fault of meaning.
pub(super) fn diagnostic_of_fault(span: Span, fault: &Fault) -> Diagnostic {
    let mut diagnostic = Diagnostic::new(span, fault.to_string()).with_label(fault.label());
    diagnostic.help = fault.help();
    diagnostic.notes = fault.notes().to_vec();
    diagnostic
}
