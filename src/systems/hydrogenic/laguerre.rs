//! Linear maps on expansions in Laguerre polynomials, sum over m of x_m L_m^a; all cost O(number of terms).

use rug::Float;
use rug::ops::NegAssign;

/// The same function in L^(a+1): L_m^a = L_m^(a+1) - L_(m-1)^(a+1).
pub(super) fn raise(x: &[Float]) -> Vec<Float> {
    let mut y = x.to_vec();
    for (slot, next) in y.iter_mut().zip(x.iter().skip(1)) {
        *slot -= next;
    }
    y
}

/// The same function in L^(a-1): L_m^a is the sum of L_i^(a-1) over i <= m.
pub(super) fn lower(x: &[Float]) -> Vec<Float> {
    let mut y = x.to_vec();
    for i in (1..y.len()).rev() {
        let (left, right) = y.split_at_mut(i);
        left[i - 1] += &right[0];
    }
    y
}

/// The same function in L^b instead of L^a.
pub(super) fn with_order(x: &[Float], a: u32, b: u32) -> Vec<Float> {
    let mut y = x.to_vec();
    for _ in a..b {
        y = raise(&y);
    }
    for _ in b..a {
        y = lower(&y);
    }
    y
}

/// Integrals with L^a from the same integrals with L^b.
pub(super) fn integrals_with_order(f: Vec<Float>, b: u32, a: u32) -> Vec<Float> {
    let mut g = f;
    for _ in b..a {
        // L_m^(a+1) is the sum of L_i^a over i <= m
        for i in 1..g.len() {
            let (left, right) = g.split_at_mut(i);
            right[0] += &left[i - 1];
        }
    }
    for _ in a..b {
        // L_m^(b-1) = L_m^b - L_(m-1)^b
        for i in (1..g.len()).rev() {
            let (left, right) = g.split_at_mut(i);
            right[0] -= &left[i - 1];
        }
    }
    g
}

/// x times the function: x L_m = -(m+1) L_(m+1) + (2m+a+1) L_m - (m+a) L_(m-1).
pub(super) fn times_variable(x: &[Float], a: u32, bits: u32) -> Vec<Float> {
    banded(x, bits, |m| [-whole(m + 1), 2 * whole(m) + i64::from(a) + 1, -(whole(m) + i64::from(a))])
}

/// The map L_m -> up(m) L_(m+1) + stay(m) L_m + down(m) L_(m-1) for [up, stay, down] = rule(m).
pub(super) fn banded(x: &[Float], bits: u32, rule: impl Fn(usize) -> [i64; 3]) -> Vec<Float> {
    let mut y = vec![Float::new(bits); if x.is_empty() { 0 } else { x.len() + 1 }];
    for (m, c) in x.iter().enumerate() {
        let [up, stay, down] = rule(m);
        y[m + 1] += Float::with_val(bits, c * up);
        y[m] += Float::with_val(bits, c * stay);
        if m > 0 {
            y[m - 1] += Float::with_val(bits, c * down);
        }
    }
    y
}

/// L_m -> L_(m-1).
pub(super) fn shift_down(x: &[Float]) -> Vec<Float> {
    x.get(1..).unwrap_or_default().to_vec()
}

/// The value at zero: the sum of x_m C(m+a, m).
pub(super) fn value_at_zero(x: &[Float], a: u32, bits: u32) -> Float {
    let mut binomial = Float::with_val(bits, 1);
    let mut sum = Float::new(bits);
    for (m, c) in x.iter().enumerate() {
        sum += c * &binomial;
        binomial *= whole(m + 1) + i64::from(a);
        binomial /= whole(m + 1);
    }
    sum
}

/// Gamma(m+a+1)/m! for m < count: the square norms of L_m^a with weight x^a e^-x.
pub(super) fn square_norms(a: u32, count: usize, bits: u32) -> Vec<Float> {
    let mut norm = Float::with_val(bits, Float::factorial(a));
    (0..count)
        .map(|m| {
            let this = norm.clone();
            norm *= whole(m + 1) + i64::from(a);
            norm /= whole(m + 1);
            this
        })
        .collect()
}

/// Entry by entry products.
pub(super) fn weighted(x: &[Float], weights: &[Float]) -> Vec<Float> {
    x.iter().zip(weights).map(|(x, w)| Float::with_val(x.prec(), x * w)).collect()
}

/// The sum of products, over the shorter length.
pub(super) fn dot(x: &[Float], y: &[Float], bits: u32) -> Float {
    let mut sum = Float::new(bits);
    for (x, y) in x.iter().zip(y) {
        sum += x * y;
    }
    sum
}

/// x + y, with lengths that may differ.
pub(super) fn sum(x: &[Float], y: &[Float]) -> Vec<Float> {
    let (long, short) = if x.len() >= y.len() { (x, y) } else { (y, x) };
    let mut out = long.to_vec();
    for (slot, c) in out.iter_mut().zip(short) {
        *slot += c;
    }
    out
}

pub(super) fn negated(mut x: Vec<Float>) -> Vec<Float> {
    x.iter_mut().for_each(NegAssign::neg_assign);
    x
}

fn whole(m: usize) -> i64 {
    super::laurent::to_power(m)
}

#[cfg(test)]
mod tests {
    use super::*;

    const BITS: u32 = 200;

    fn floats(x: &[i32]) -> Vec<Float> {
        x.iter().map(|&c| Float::with_val(BITS, c)).collect()
    }

    /// sum of x_m L_m^a(t), by the three-term recursion.
    fn value(x: &[Float], a: u32, t: f64) -> Float {
        let t = Float::with_val(BITS, t);
        let (mut before, mut now) = (Float::new(BITS), Float::with_val(BITS, 1));
        let mut sum = Float::new(BITS);
        for (m, c) in x.iter().enumerate() {
            sum += c * &now;
            let m = whole(m);
            let next = (Float::with_val(BITS, 2 * m + i64::from(a) + 1) - &t) * &now - (m + i64::from(a)) * before;
            before = now;
            now = next / (m + 1);
        }
        sum
    }

    fn close(x: &Float, y: &Float) -> bool {
        Float::with_val(BITS, x - y).abs() <= Float::with_val(BITS, y.abs_ref()) >> (BITS - 40)
    }

    #[test]
    fn maps_keep_or_multiply_the_function() {
        let x = floats(&[3, -2, 5, 0, 7]);
        for (a, t) in [(0, 0.3), (1, 2.5), (4, 11.0)] {
            let here = value(&x, a, t);
            assert!(close(&value(&raise(&x), a + 1, t), &here));
            assert!(close(&value(&with_order(&x, a, a + 3), a + 3, t), &here));
            assert!(close(&value(&with_order(&with_order(&x, a, a + 3), a + 3, a), a, t), &here));
            assert!(close(&value(&times_variable(&x, a, BITS), a, t), &(here * t)));
            assert!(close(&value_at_zero(&x, a, BITS), &value(&x, a, 0.0)));
        }
    }

    /// Changing the order of the functions and of the integrals are transposes of each other.
    #[test]
    fn integrals_follow_the_functions() {
        let (x, f) = (floats(&[3, -2, 5, 1, 7]), floats(&[1, 4, -9, 2, 6]));
        for (a, b) in [(1, 4), (4, 1), (2, 2)] {
            // <f in L^b| x in L^b> with x = the function given in L^a
            let direct = dot(&with_order(&x, a, b), &f, BITS);
            let turned = dot(&x, &integrals_with_order(f.clone(), b, a), BITS);
            assert!(close(&direct, &turned), "{a} {b}");
        }
    }
}
