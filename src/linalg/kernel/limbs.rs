//! Fixed-point numbers of a fixed count of limbs: the arithmetic of the dense kernels, without allocation.
//!
//! A number is `sum limb_i 2^(60 i) 2^-(60 L - 24)` with signed limbs from -2^59 to 2^59: 24 bits stand before the
//! point. Products of limbs are below 2^118, so that an `i128` takes hundreds of them before a carry.

use rug::integer::Order;
use rug::{Float, Integer};

/// Bits of a limb.
pub(super) const RADIX: u32 = 60;

/// Bits before the point, sign included.
pub(super) const HEAD: u32 = 24;

/// Numbers of a factor stay below 2^LIMIT, so that sums of products cannot overflow.
pub(super) const LIMIT: u32 = 14;

/// Sums of products, before a pivot divides them, stay below 2^SUM_LIMIT.
const SUM_LIMIT: u32 = 22;

const MASK: i128 = (1 << RADIX) - 1;

/// A fixed-point number.
pub(super) type Limbs<const L: usize> = [i64; L];

/// Returns the bits behind the point of numbers of so many limbs.
pub(super) const fn fraction_bits(limbs: usize) -> u32 {
    RADIX * limbs as u32 - HEAD
}

/// Returns the bits behind the point that are right in the sum of so many products.
pub(super) const fn accurate_bits(limbs: usize, terms: usize) -> u32 {
    let parts = terms as u64 * limbs as u64;
    (fraction_bits(limbs) + 2 - HEAD).saturating_sub(u64::BITS - parts.leading_zeros())
}

/// A result left the range of fixed-point numbers.
#[derive(Clone, Copy, PartialEq, Eq, Debug)]
pub(super) struct Overflow;

/// The upper L columns of a sum of products, column c in units of 2^(60 (c + L - 1)) of the square of the unit.
#[derive(Clone, Copy, Debug)]
pub(super) struct Sum<const L: usize>([i128; L]);

impl<const L: usize> Sum<L> {
    /// Products added between carries, so that no column overflows.
    const CHUNK: usize = 256 / L;

    /// Returns `sum a_k b_k` without its lowest L - 1 columns.
    ///
    /// *Shapes*: the shorter of the two counts. *Accuracy*: what is left out is below 2^22 (L - 1) units in the last
    /// place for each term, see [`accurate_bits`]; otherwise exact, so that the order of terms does not matter.
    /// *Cost*: L (L + 1)/2 products of words a term, where an exact sum would take L^2.
    #[inline]
    pub fn of_products(a: &[Limbs<L>], b: &[Limbs<L>]) -> Self {
        let mut sum = Self([0; L]);
        for (a, b) in a.chunks(Self::CHUNK).zip(b.chunks(Self::CHUNK)) {
            for (a, b) in a.iter().zip(b) {
                sum.add_product(a, b);
            }
            sum.carry();
        }
        sum
    }

    #[inline(always)]
    #[expect(clippy::needless_range_loop, reason = "iterators cost a tenth of the speed here")]
    fn add_product(&mut self, a: &Limbs<L>, b: &Limbs<L>) {
        for i in 0..L {
            for j in L - 1 - i..L {
                let column = &mut self.0[i + j + 1 - L];
                *column = column.wrapping_add(i128::from(a[i]).wrapping_mul(i128::from(b[j])));
            }
        }
    }

    #[inline(always)]
    fn carry(&mut self) {
        for c in 0..L - 1 {
            let carry = self.0[c] >> RADIX;
            self.0[c] &= MASK;
            self.0[c + 1] = self.0[c + 1].wrapping_add(carry);
        }
    }

    /// Returns `2^exponent` times the sum, rounded down to a unit.
    #[inline]
    pub fn scaled(mut self, exponent: i64) -> Result<Limbs<L>, Overflow> {
        self.carry();
        // Digits of 60 bits from column 0 up; those above the last repeat the sign.
        let (top, last) = (self.0[L - 1], L as i64 - 1);
        let digit = |c: i64| -> i64 {
            if c < 0 {
                0
            } else if c < last {
                self.0[c as usize] as i64
            } else {
                ((top >> (i64::from(RADIX) * (c - last)).min(127)) & MASK) as i64
            }
        };
        let shift = i64::from(RADIX - HEAD) - exponent;
        let (whole, bits) = (shift.div_euclid(i64::from(RADIX)), shift.rem_euclid(i64::from(RADIX)) as u32);
        let mut out = [0i64; L];
        for (i, out) in out.iter_mut().enumerate() {
            let c = i as i64 + whole;
            *out = (digit(c) >> bits) | ((i128::from(digit(c + 1)) << (RADIX - bits)) & MASK) as i64;
        }
        // Everything above must repeat the sign.
        let sign = if top < 0 { MASK as i64 } else { 0 };
        let above = L as i64 + whole;
        let split = above >= 0 && digit(above) >> bits != sign >> bits;
        if split || ((above + 1).max(0)..last + 4).any(|c| digit(c) != sign) {
            return Err(Overflow);
        }
        if top < 0 {
            out[L - 1] -= 1 << RADIX;
        }
        balance(&mut out);
        if within(&out, LIMIT) { Ok(out) } else { Err(Overflow) }
    }

    /// Reads the columns into an integer and returns the exponent of its unit.
    pub fn read(&self, value: &mut Integer) -> i64 {
        *value = Integer::new();
        for column in self.0.iter().rev() {
            *value <<= RADIX;
            *value += *column;
        }
        i64::from(RADIX) * (L as i64 - 1) - 2 * i64::from(fraction_bits(L))
    }

    /// Returns the sum rounded down to a unit: the quick form of [`Sum::scaled`] for exponent 0, with the wider range
    /// of sums.
    #[inline]
    pub fn rounded(mut self) -> Result<Limbs<L>, Overflow> {
        const DOWN: u32 = RADIX - HEAD;
        self.carry();
        let mut out = [0i64; L];
        for (out, pair) in out.iter_mut().zip(self.0.windows(2)) {
            *out = ((pair[0] >> DOWN) | ((pair[1] << HEAD) & MASK)) as i64;
        }
        let top = self.0[L - 1] >> DOWN;
        if top.unsigned_abs() >> RADIX != 0 {
            return Err(Overflow);
        }
        out[L - 1] = top as i64;
        balance(&mut out);
        if within(&out, SUM_LIMIT) { Ok(out) } else { Err(Overflow) }
    }
}

/// Brings limbs between 0 and 2^60, the top one signed, into the range from -2^59 to 2^59.
#[inline(always)]
fn balance<const L: usize>(limbs: &mut Limbs<L>) {
    for i in 0..L - 1 {
        let carry = carry_of(limbs[i]);
        limbs[i] -= carry << RADIX;
        limbs[i + 1] += carry;
    }
}

/// Returns the nearest multiple of the radix.
#[inline(always)]
fn carry_of(limb: i64) -> i64 {
    (limb + (1 << (RADIX - 1))) >> RADIX
}

/// Tells whether a number is below 2^bits in absolute value.
#[inline]
pub(super) fn within<const L: usize>(a: &Limbs<L>, bits: u32) -> bool {
    a[L - 1].unsigned_abs() < 1 << (RADIX - HEAD + bits)
}

/// Returns a - b, carries settled.
#[inline]
pub(super) fn difference<const L: usize>(a: &Limbs<L>, b: &Limbs<L>) -> Limbs<L> {
    let mut out = [0i64; L];
    let mut carry = 0;
    for i in 0..L - 1 {
        let limb = a[i] - b[i] + carry;
        carry = carry_of(limb);
        out[i] = limb - (carry << RADIX);
    }
    out[L - 1] = a[L - 1] - b[L - 1] + carry;
    out
}

/// Returns -a.
#[inline]
pub(super) fn negated<const L: usize>(a: &Limbs<L>) -> Limbs<L> {
    a.map(|limb| -limb)
}

/// Returns a product times `2^exponent`, rounded down.
#[inline]
pub(super) fn product<const L: usize>(a: &Limbs<L>, b: &Limbs<L>, exponent: i64) -> Result<Limbs<L>, Overflow> {
    let mut sum = Sum([0; L]);
    sum.add_product(a, b);
    sum.scaled(exponent)
}

/// Returns the sign of a number: -1, 0 or 1.
pub(super) fn sign(a: &[i64]) -> i64 {
    // A lower limb is at most half a unit of the next, so that the highest one that is not zero decides.
    a.iter().rev().find(|limb| **limb != 0).map_or(0, |limb| limb.signum())
}

/// Compares absolute values.
pub(super) fn compare_sizes<const L: usize>(a: &Limbs<L>, b: &Limbs<L>) -> std::cmp::Ordering {
    let absolute = |x: &Limbs<L>| if sign(x) < 0 { negated(x) } else { *x };
    sign(&difference(&absolute(a), &absolute(b))).cmp(&0)
}

/// Writes `value 2^exponent`, cut to a unit towards zero, as limbs; `scratch` is room to work in.
///
/// *Range*: the number stays below 2^LIMIT. *Errors*: it does not.
pub(super) fn write(limbs: &mut [i64], value: &Float, exponent: i64, scratch: &mut Vec<u64>) -> Result<(), Overflow> {
    limbs.fill(0);
    let (Some(significand), Some(own)) = (value.get_significand(), value.get_exp()) else { return Ok(()) };
    let length = significand.significant_digits::<u64>();
    if scratch.len() < length {
        scratch.resize(length, 0);
    }
    let digits = &mut scratch[..length];
    significand.write_digits(digits, Order::Lsf);
    let exponent = i64::from(own) + exponent;
    if exponent > i64::from(LIMIT) {
        return Err(Overflow);
    }
    // The last bit of the significand stands at this place of the fixed-point number.
    let place = i64::from(fraction_bits(limbs.len())) + exponent - i64::from(significand.significant_bits());
    for (i, limb) in limbs.iter_mut().enumerate() {
        *limb = bits_at(digits, i as i64 * i64::from(RADIX) - place);
    }
    let mut carry = 0;
    let top = limbs.len() - 1;
    for limb in &mut limbs[..top] {
        *limb += carry;
        carry = carry_of(*limb);
        *limb -= carry << RADIX;
    }
    limbs[top] += carry;
    if value.is_sign_negative() {
        for limb in limbs {
            *limb = -*limb;
        }
    }
    Ok(())
}

/// Returns 60 bits from a place on, zeros outside.
#[inline]
fn bits_at(digits: &[u64], place: i64) -> i64 {
    let (word, bit) = (place.div_euclid(64), place.rem_euclid(64) as u32);
    let at = |w: i64| usize::try_from(w).ok().and_then(|w| digits.get(w)).map_or(0, |d| u128::from(*d));
    (((at(word) | (at(word + 1) << 64)) >> bit) as i128 & MASK) as i64
}

/// Returns the number times `2^exponent` as a float.
pub(super) fn read(limbs: &[i64], exponent: i64, precision: u32) -> Float {
    let mut value = Integer::new();
    for limb in limbs.iter().rev() {
        value <<= RADIX;
        value += *limb;
    }
    let mut value = Float::with_val(precision, value);
    super::super::vectors::shift(&mut value, exponent - i64::from(fraction_bits(limbs.len())));
    value
}

#[cfg(test)]
mod tests {
    use super::*;
    use rug::ops::NegAssign;

    /// Irregular integers, corners favoured: all bits set, single bits, zeros.
    fn irregular(state: &mut u64, bits: u32) -> Integer {
        let mut next = || {
            *state = state.wrapping_mul(6_364_136_223_846_793_005).wrapping_add(1_442_695_040_888_963_407);
            *state >> 32
        };
        let mut value = match next() % 4 {
            0 => (Integer::from(1) << bits) - 1,
            1 => Integer::from(1) << (next() as u32 % bits),
            _ => (0..bits / 32).fold(Integer::new(), |v, _| (v << 32u32) + next()),
        };
        value >>= next() as u32 % bits;
        if next() % 2 == 0 {
            value.neg_assign();
        }
        value
    }

    fn limbs<const L: usize>(value: &Integer) -> Limbs<L> {
        let mut out = [0; L];
        let float = Float::with_val(value.significant_bits().max(2), value);
        write(&mut out, &float, -i64::from(fraction_bits(L)), &mut Vec::new()).expect("in range");
        assert!(out.iter().take(L - 1).all(|l| l.unsigned_abs() <= 1 << (RADIX - 1)));
        out
    }

    fn integer(limbs: &[i64]) -> Integer {
        limbs.iter().rev().fold(Integer::new(), |v, l| (v << RADIX) + *l)
    }

    fn sums_of_products<const L: usize>() {
        let mut state = L as u64;
        let bits = fraction_bits(L) + 2;
        for round in 0..300 {
            let count = 1 + (round * 7) % 400;
            let draw = |state: &mut u64| (0..count).map(|_| irregular(state, bits)).collect::<Vec<_>>();
            let (a, b) = (draw(&mut state), draw(&mut state));
            let exact = a.iter().zip(&b).fold(Integer::new(), |s, (a, b)| s + a * b) >> fraction_bits(L);
            let (a, b): (Vec<_>, Vec<_>) = (a.iter().map(limbs::<L>).collect(), b.iter().map(limbs::<L>).collect());
            let sum = Sum::of_products(&a, &b);
            let in_range = exact.clone().abs() < Integer::from(1) << (fraction_bits(L) + LIMIT - 1);
            match (sum.rounded(), sum.scaled(0)) {
                (Ok(quick), Ok(general)) => {
                    assert_eq!(quick, general);
                    let slack = 1 + ((count * (L - 1)) << (HEAD - 2));
                    assert!((integer(&quick) - exact).abs() <= slack);
                }
                (_, general) => {
                    assert_eq!(general, Err(Overflow));
                    assert!(!in_range);
                }
            }
        }
    }

    #[test]
    fn sums_agree_with_integers() {
        sums_of_products::<2>();
        sums_of_products::<3>();
        sums_of_products::<4>();
        sums_of_products::<7>();
        sums_of_products::<16>();
    }

    #[test]
    fn scaled_products_agree_with_integers() {
        let mut state = 77;
        for exponent in (-200..=230).chain([-4000, 4000]) {
            let (a, b) = (irregular(&mut state, 150), irregular(&mut state, 224));
            let exact = Integer::from(&a * &b);
            let down = i64::from(fraction_bits(4)) - exponent;
            let exact = if down >= 0 { exact >> down as u32 } else { exact << (-down) as u32 };
            let result = product(&limbs::<4>(&a), &limbs::<4>(&b), exponent);
            let slack = 1 + (Integer::from(3) << (exponent + 22).clamp(0, 4022) as u32);
            match result {
                Ok(result) => assert!((integer(&result) - exact).abs() <= slack, "exponent {exponent}"),
                Err(Overflow) => assert!(exact.abs() + slack >= Integer::from(1) << (fraction_bits(4) + LIMIT - 1)),
            }
        }
    }

    #[test]
    fn differences_and_signs() {
        let mut state = 5;
        for _ in 0..2000 {
            let (a, b) = (irregular(&mut state, 224), irregular(&mut state, 224));
            let (x, y) = (limbs::<4>(&a), limbs::<4>(&b));
            assert_eq!(integer(&difference(&x, &y)), Integer::from(&a - &b));
            assert_eq!(integer(&negated(&x)), Integer::from(-&a));
            assert_eq!(sign(&x), a.cmp0() as i64);
            assert_eq!(compare_sizes(&x, &y), a.cmp_abs(&b));
        }
    }

    #[test]
    fn floats_come_and_go() {
        let mut scratch = Vec::new();
        for text in ["0", "1", "-1", "0.1", "-1023.9", "1e-30", "-1e-66", "1e-200"] {
            let value = Float::with_val(180, Float::parse(text).expect("a number"));
            let mut out = [0; 5];
            write(&mut out, &value, 0, &mut scratch).expect("in range");
            let off = Float::with_val(400, read(&out, 0, 400) - &value);
            assert!(off.get_exp().is_none_or(|e| e <= -(fraction_bits(5) as i32)));
        }
        assert_eq!(write(&mut [0; 2], &Float::with_val(64, 16385), 0, &mut scratch), Err(Overflow));
        assert_eq!(write(&mut [0; 2], &Float::with_val(64, 16385), -1, &mut scratch), Ok(()));
    }
}
