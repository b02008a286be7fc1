//! Cartesian indices in a bracket: each stands twice and is summed over x, y, z.

use super::terms::*;

/// Cartesian summation indices are the components i, j and k.
pub fn is_index(component: &str) -> bool {
    matches!(component, "i" | "j" | "k")
}

pub(in crate::theory) type Counts = std::collections::BTreeMap<String, usize>;

pub(in crate::theory) fn count_indices(operator: &OperatorTerm, count: &mut Counts) {
    match &*operator.node {
        OperatorNode::Atom(AtomTerm { component: Some(component), power, .. }) if is_index(component) => {
            *count.entry(component.clone()).or_default() += power.unsigned_abs() as usize;
        }
        OperatorNode::Tensor(TensorTerm { component: Some(component), .. }) if is_index(component) => {
            *count.entry(component.clone()).or_default() += 1;
        }
        OperatorNode::Tensor(_) | OperatorNode::Atom(_) | OperatorNode::Scalar(_) | OperatorNode::Hamiltonian => {}
        OperatorNode::Resolvent(_) | OperatorNode::Function(..) => {}
        OperatorNode::Sum(terms) => {
            // Every term of a sum must carry the same indices; the largest count shows the first that does not.
            let mut joined = Counts::new();
            for term in terms {
                let mut single = Counts::new();
                count_indices(term, &mut single);
                for (index, n) in single {
                    let entry = joined.entry(index).or_default();
                    *entry = (*entry).max(n);
                }
            }
            for (index, n) in joined {
                *count.entry(index).or_default() += n;
            }
        }
        OperatorNode::Product(factors) => factors.iter().for_each(|factor| count_indices(factor, count)),
        OperatorNode::Adjoint(inner) => count_indices(inner, count),
        OperatorNode::Power(inner, power) => (0..*power).for_each(|_| count_indices(inner, count)),
        OperatorNode::Dyad(ket, bra) => {
            count_indices_ket(ket, count);
            count_indices_ket(bra, count);
        }
        OperatorNode::Call(call) => {
            if let Meaning::Operator(body) = &call.definition.body {
                count_indices(body, count);
            }
        }
    }
}

pub(super) fn count_indices_ket(ket: &KetTerm, count: &mut Counts) {
    match &*ket.node {
        KetNode::State(_) => {}
        KetNode::Applied(operator, inner) => {
            count_indices(operator, count);
            count_indices_ket(inner, count);
        }
        KetNode::Sum(terms) => terms.iter().for_each(|term| count_indices_ket(term, count)),
        KetNode::Scaled(_, inner) => count_indices_ket(inner, count),
        KetNode::Call(call) => {
            if let Meaning::Ket(body) = &call.definition.body {
                count_indices_ket(body, count);
            }
        }
    }
}
