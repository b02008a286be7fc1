//! How functions behave at the nucleus: what decides whether a matrix element exists.
//!
//! A finite basis never shows a divergence, so the powers are followed by algebra alongside the numbers.

/// The leading behaviour r^power of a function at the nucleus, times ln r where `logarithm`.
#[derive(Clone, Copy, PartialEq, Eq, Debug)]
pub(super) struct Origin {
    pub(super) power: i64,
    pub(super) logarithm: bool,
    /// Whether the coefficient of that power is known not to cancel.
    pub(super) certain: bool,
    /// Whether a plain power series follows, without logarithms.
    pub(super) analytic: bool,
    /// Whether a delta function comes with it, be it only in the limit of a complete basis.
    pub(super) delta: bool,
}

/// The power of a function that is zero.
const NOWHERE: i64 = i64::MAX / 8;

impl Origin {
    pub(super) const fn pure(power: i64) -> Self {
        Origin { power, logarithm: false, certain: true, analytic: true, delta: false }
    }

    /// The zero function's.
    pub(super) const fn zero() -> Self {
        Self::pure(NOWHERE)
    }

    /// That of a delta function alone.
    pub(super) const fn contact() -> Self {
        Origin { delta: true, ..Self::zero() }
    }

    /// Whether the function part is zero.
    fn is_zero(self) -> bool {
        self.power >= NOWHERE / 2
    }

    fn shifted(self, s: i64) -> Self {
        if self.is_zero() { self } else { Origin { power: self.power + s, ..self } }
    }

    /// After r^s; a delta function survives only the identity.
    pub(super) fn times_power(self, s: i64, same_block: bool) -> Self {
        Origin { delta: self.delta && s == 0 && same_block, ..self.shifted(s) }
    }

    /// The leading behaviour of a sum.
    pub(super) fn joined(self, other: Self) -> Self {
        let leading = match self.power.cmp(&other.power) {
            std::cmp::Ordering::Less => self,
            std::cmp::Ordering::Greater => other,
            std::cmp::Ordering::Equal => {
                Origin { logarithm: self.logarithm || other.logarithm, certain: self.certain && other.certain, ..self }
            }
        };
        Origin { delta: self.delta || other.delta, analytic: self.analytic && other.analytic, ..leading }
    }

    /// After the radial gradient from block l to lp.
    pub(super) fn gradient(self, l: u32, lp: u32) -> Self {
        // u' - (l+1) u/r takes r^(l+1) away
        let kept = lp > l && self.power == i64::from(l) + 1 && !self.logarithm;
        if kept { self } else { self.shifted(-1) }
    }

    /// After p^2 in block l.
    ///
    /// 1/r in s waves, that is r^0, leaves a delta function; of what follows r goes, but r ln r becomes r^-1.
    pub(super) fn p_squared(self, l: u32) -> Self {
        if self.logarithm {
            return self.shifted(-2);
        }
        if l == 0 && self.power == 0 {
            return Origin { delta: true, ..self.shifted(if self.analytic { 0 } else { -1 }) };
        }
        self.shifted(if self.power == i64::from(l) + 1 { -1 } else { -2 })
    }

    /// After H in block l, where the leading terms of p^2/2 and 1/r may cancel.
    pub(super) fn hamiltonian(self, l: u32) -> Self {
        let lowest = self.p_squared(l).joined(self.shifted(-1));
        Origin { certain: lowest.certain && lowest.power < i64::from(l), ..lowest }
    }

    /// The solution of (z - H) u = f in block l, for the f that behaves like this.
    ///
    /// The source asks for r^(q+2); the regular solution r^(l+1) comes with it, and with a logarithm where the two coincide.
    pub(super) fn solution(self, l: u32) -> Self {
        let regular = i64::from(l) + 1;
        // a delta function asks for r^0
        let source = if self.delta { Origin { delta: false, ..self.joined(Self::pure(-2)) } } else { self };
        if source.is_zero() || source.power + 2 > regular {
            Origin { analytic: source.analytic, ..Origin::pure(regular) }
        } else {
            let logarithm = source.logarithm || source.power + 2 == regular;
            Origin { power: source.power + 2, logarithm, analytic: false, ..source }
        }
    }

    /// The power of r that a source meets in block l when its equation is solved, if that is too low for the equation to have a solution.
    pub(super) fn too_singular_for_source(self, l: u32) -> Option<i64> {
        let power = self.power.saturating_add(i64::from(l) + 1);
        (power < 0).then_some(power)
    }

    /// Whether a delta function has a finite value here.
    pub(super) fn finite_at_nucleus(self) -> bool {
        !self.delta && (self.power > 1 || (self.power == 1 && !self.logarithm))
    }

    /// Whether p^2 in block l leaves a function, with at most a delta function in s waves.
    pub(super) fn has_p_squared(self, l: u32) -> bool {
        !self.delta && (self.power > -i64::from(l) || (l == 0 && self.power == 0 && !self.logarithm))
    }

    /// Whether the gradient towards block lp leaves a function.
    pub(super) fn has_gradient(self, lp: u32) -> bool {
        !self.delta && self.power > -i64::from(lp) - 1
    }
}

#[cfg(test)]
mod tests {
    use super::*;

    #[test]
    fn perturbed_functions_of_singular_operators() {
        // r^-3 on 2p (r^2): the solution starts with r^1; again r^-3 between them is finite, r^-4 is not
        let solution = Origin::pure(2).times_power(-3, true).solution(1);
        assert_eq!((solution.power, solution.logarithm), (1, false));
        // r^-2 on 1s: r ln r
        let solution = Origin::pure(1).times_power(-2, true).solution(0);
        assert_eq!((solution.power, solution.logarithm), (1, true));
        assert!(!solution.finite_at_nucleus());
        // p^4 and delta(r) on s states: the solution starts with r^0, that is 1/r
        let source = Origin::pure(1).p_squared(0).p_squared(0);
        assert_eq!((source.power, source.delta), (0, true));
        let solution = source.solution(0);
        assert_eq!((solution.power, solution.analytic), (0, false));
        assert_eq!(solution.p_squared(0).power, -1);
        assert_eq!(Origin::contact().solution(0).power, 0);
        // p^4 on 2p: r^2 -> r -> 1/r -> the solution starts with r
        assert_eq!(Origin::pure(2).p_squared(1).p_squared(1).solution(1).power, 1);
    }

    #[test]
    fn delta_functions_vanish_with_a_power_of_r() {
        assert!(Origin::contact().times_power(0, true).delta);
        assert!(!Origin::contact().times_power(1, true).delta);
        assert!(!Origin::contact().times_power(0, false).delta);
    }
}
