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
}

/// The power of a function that is zero.
const NOWHERE: i64 = i64::MAX / 8;

impl Origin {
    pub(super) const fn pure(power: i64) -> Self {
        Origin { power, logarithm: false, certain: true }
    }

    /// The zero function's.
    pub(super) const fn zero() -> Self {
        Self::pure(NOWHERE)
    }

    /// A delta function counts as r^-2: that is what solving for it adds two powers to.
    pub(super) const fn contact() -> Self {
        Self::pure(-2)
    }

    pub(super) fn is_zero(self) -> bool {
        self.power >= NOWHERE / 2
    }

    pub(super) fn times_power(self, s: i64) -> Self {
        if self.is_zero() { self } else { Origin { power: self.power + s, ..self } }
    }

    /// The leading behaviour of a sum.
    pub(super) fn joined(self, other: Self) -> Self {
        match self.power.cmp(&other.power) {
            std::cmp::Ordering::Less => self,
            std::cmp::Ordering::Greater => other,
            std::cmp::Ordering::Equal => Origin {
                power: self.power,
                logarithm: self.logarithm || other.logarithm,
                certain: self.certain && other.certain,
            },
        }
    }

    /// After the radial gradient from block l to lp.
    pub(super) fn gradient(self, l: u32, lp: u32) -> Self {
        if self.is_zero() {
            return self;
        }
        // u' - (l+1) u/r takes r^(l+1) away
        let kept = lp > l && self.power == i64::from(l) + 1 && !self.logarithm;
        if kept { self } else { self.times_power(-1) }
    }

    /// After p^2 in block l.
    pub(super) fn p_squared(self, l: u32) -> Self {
        if self.is_zero() {
            return self;
        }
        let regular = i64::from(l) + 1;
        if self.power == regular && !self.logarithm { self.times_power(-1) } else { self.times_power(-2) }
    }

    /// After H in block l, where the leading terms of p^2/2 and 1/r may cancel.
    pub(super) fn hamiltonian(self, l: u32) -> Self {
        let lowest = self.p_squared(l).joined(self.times_power(-1));
        Origin { certain: lowest.certain && lowest.power < i64::from(l), ..lowest }
    }

    /// The solution of (z - H) u = f in block l, for the f that behaves like this.
    ///
    /// The source asks for r^(q+2); the regular solution r^(l+1) comes with it, and with a logarithm where the two coincide.
    pub(super) fn solution(self, l: u32) -> Self {
        let regular = i64::from(l) + 1;
        if self.is_zero() || self.power + 2 > regular {
            Origin::pure(regular)
        } else {
            Origin {
                power: self.power + 2,
                logarithm: self.logarithm || self.power + 2 == regular,
                certain: self.certain,
            }
        }
    }

    /// Whether a delta function has a finite value here.
    pub(super) fn finite_at_nucleus(self) -> bool {
        self.power > 1 || (self.power == 1 && !self.logarithm)
    }

    /// Whether p^2 in block l leaves a function, with at most a delta function in s waves.
    pub(super) fn has_p_squared(self, l: u32) -> bool {
        self.power > -i64::from(l) || (l == 0 && self.power == 0 && !self.logarithm)
    }

    /// Whether the gradient towards block lp leaves a function.
    pub(super) fn has_gradient(self, lp: u32) -> bool {
        self.power > -i64::from(lp) - 1
    }
}

#[cfg(test)]
mod tests {
    use super::*;

    #[test]
    fn perturbed_functions_of_singular_operators() {
        // r^-3 on 2p (r^2): the solution starts with r^1; again r^-3 between them is finite, r^-4 is not
        let solution = Origin::pure(2).times_power(-3).solution(1);
        assert_eq!((solution.power, solution.logarithm), (1, false));
        // r^-2 on 1s: r ln r
        let solution = Origin::pure(1).times_power(-2).solution(0);
        assert_eq!((solution.power, solution.logarithm), (1, true));
        assert!(!solution.finite_at_nucleus());
        // p^4 and delta(r) on s states: the solution starts with r^0, that is 1/r
        assert_eq!(Origin::pure(1).p_squared(0).p_squared(0).solution(0).power, 0);
        assert_eq!(Origin::contact().solution(0).power, 0);
        // p^4 on 2p: r^2 -> r -> 1/r -> the solution starts with r
        assert_eq!(Origin::pure(2).p_squared(1).p_squared(1).solution(1).power, 1);
    }
}
