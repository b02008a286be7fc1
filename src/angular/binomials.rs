//! Binomial coefficients that fit a machine word, and alternating sums of their products.

use rug::{Assign, Integer};

/// C(n, k) fits 64 bits for every n below this.
const END: usize = 68;

/// All binomial coefficients C(n, k) with n below [`END`].
static TABLE: [[u64; END]; END] = table();

const fn table() -> [[u64; END]; END] {
    let mut table = [[0; END]; END];
    let mut n = 0;
    while n < END {
        table[n][0] = 1;
        let mut k = 1;
        while k <= n {
            table[n][k] = table[n - 1][k - 1] + table[n - 1][k];
            k += 1;
        }
        n += 1;
    }
    table
}

/// C(n, k) from the table; `None` where n is beyond it.
fn small(n: i32, k: i32) -> Option<i128> {
    let row = TABLE.get(usize::try_from(n).ok()?)?;
    Some(i128::from(*row.get(usize::try_from(k).ok()?)?))
}

fn large(n: i32, k: i32) -> Integer {
    let (n, k) = (u32::try_from(n).unwrap_or(0), u32::try_from(k).unwrap_or(0));
    Integer::from(Integer::binomial_u(n, k))
}

/// sum over k of (-1)^k C(a, k) C(b, x - k) C(c, y - k).
pub(super) fn three_product_sum(a: i32, b: i32, c: i32, x: i32, y: i32) -> Integer {
    let first = 0.max(x - b).max(y - c);
    let last = a.min(x).min(y);
    if first > last {
        return Integer::new();
    }
    let in_words = || {
        let mut sum = 0_i128;
        for k in first..=last {
            let term = small(a, k)?.checked_mul(small(b, x - k)?)?.checked_mul(small(c, y - k)?)?;
            sum = sum.checked_add(if k % 2 == 0 { term } else { -term })?;
        }
        Some(sum)
    };
    if let Some(sum) = in_words() {
        return Integer::from(sum);
    }
    let (mut sum, mut divisor) = (Integer::new(), Integer::new());
    let mut term = large(a, first) * large(b, x - first) * large(c, y - first);
    for k in first..=last {
        if k % 2 == 0 {
            sum += &term;
        } else {
            sum -= &term;
        }
        if k < last {
            // every binomial moves to its neighbour; the product stays whole
            term *= word_product([a - k, x - k, y - k, 1]);
            divisor.assign(word_product([k + 1, b - x + k + 1, c - y + k + 1, 1]));
            term.div_exact_mut(&divisor);
        }
    }
    sum
}

/// sum over t of (-1)^t C(t+1, l0+1) C(u0-l1, t-l1) C(u1-l2, t-l2) C(u2-l3, t-l3), for l0 the largest of the lower bounds.
pub(super) fn four_product_sum(lower: &[i32; 4], upper: &[i32; 3]) -> Integer {
    let [l0, l1, l2, l3] = *lower;
    let [u0, u1, u2] = *upper;
    let last = u0.min(u1).min(u2);
    if l0 > last {
        return Integer::new();
    }
    let in_words = || {
        let mut sum = 0_i128;
        for t in l0..=last {
            let left = small(t + 1, l0 + 1)?.checked_mul(small(u0 - l1, t - l1)?)?;
            let right = small(u1 - l2, t - l2)?.checked_mul(small(u2 - l3, t - l3)?)?;
            let term = left.checked_mul(right)?;
            sum = sum.checked_add(if t % 2 == 0 { term } else { -term })?;
        }
        Some(sum)
    };
    if let Some(sum) = in_words() {
        return Integer::from(sum);
    }
    let (mut sum, mut divisor) = (Integer::new(), Integer::new());
    let mut term = large(u0 - l1, l0 - l1) * large(u1 - l2, l0 - l2) * large(u2 - l3, l0 - l3);
    for t in l0..=last {
        if t % 2 == 0 {
            sum += &term;
        } else {
            sum -= &term;
        }
        if t < last {
            term *= word_product([t + 2, u0 - t, u1 - t, u2 - t]);
            divisor.assign(word_product([t + 1 - l0, t + 1 - l1, t + 1 - l2, t + 1 - l3]));
            term.div_exact_mut(&divisor);
        }
    }
    sum
}

/// The product of factors below 2^15 each.
fn word_product(factors: [i32; 4]) -> u64 {
    factors.into_iter().map(|factor| u64::try_from(factor).unwrap_or(0)).product()
}

#[cfg(test)]
mod tests {
    use super::*;

    /// Both ways of adding, in words and in long integers, where both are possible and where only the long one is.
    #[test]
    fn sums_are_those_of_long_integers() {
        for (a, b, c, x, y) in [(4, 5, 6, 3, 7), (20, 18, 15, 19, 14), (40, 41, 43, 39, 38), (90, 80, 70, 85, 60)] {
            let mut direct = Integer::new();
            for k in 0.max(x - b).max(y - c)..=a.min(x).min(y) {
                let term = large(a, k) * large(b, x - k) * large(c, y - k);
                direct += if k % 2 == 0 { term } else { -term };
            }
            assert_eq!(three_product_sum(a, b, c, x, y), direct, "{a} {b} {c} {x} {y}");
        }
        for (lower, upper) in
            [([6, 5, 4, 3], [9, 8, 7]), ([30, 29, 30, 28], [40, 41, 42]), ([120, 100, 119, 90], [150, 160, 140])]
        {
            let mut direct = Integer::new();
            for t in lower[0]..=upper.into_iter().min().expect("three") {
                let rest = (0..3).map(|i| large(upper[i] - lower[i + 1], t - lower[i + 1])).product::<Integer>();
                let term = large(t + 1, lower[0] + 1) * rest;
                direct += if t % 2 == 0 { term } else { -term };
            }
            assert_eq!(four_product_sum(&lower, &upper), direct, "{lower:?} {upper:?}");
        }
    }
}
