"""Dynamic polarizabilities of hydrogen by another way than the program's.

For each energy the resolvent of a block is diagonal in the Sturmian functions u_N of exponent kappa = sqrt(-2 E),
    (-1/2 d^2/dr^2 + l (l+1)/(2 r^2) + kappa^2/2) u_N = (N kappa/r) u_N,   int u_N u_M / r dr = delta_NM,
so that (E - H)^-1 = - sum_N u_N u_N / (N kappa - 1) (Rotenberg, Adv. At. Mol. Phys. 6, 233 (1970); derived here anew), with
    u_N = c r^(l+1) e^(-kappa r) L^(2l+1)_(N-l-1)(2 kappa r),   c^2 = (2 kappa)^(2l+2) (N-l-1)!/(N+l)!,
and the overlaps with the source in closed form,
    int r^q e^(-s r) L^a_m(t r) dr = binom(m+a, m) q!/s^(q+1) 2F1(-m, q+1; a+1; t/s).
No linear system is solved, the exponent follows the energy, and the terms fall off geometrically.

Prints lines `expression <tab> real part [<tab> imaginary part]` with 60 digits; the expressions are those of tests/reference.rs.
"""

from mpmath import binomial, factorial, findroot, hyp2f1, mp, mpc, mpf, nstr, re, sqrt

mp.dps = 80


def radial(energy, l, exponent, terms):
    """<s| (E - H)^-1 |s> in the block l, for the source s = e^(-exponent r) sum of factor r^power."""
    kappa = sqrt(-2 * energy)
    s, t, a = exponent + kappa, 2 * kappa, 2 * l + 1
    total, m, small = mpf(0), 0, 0
    while small < 3:
        overlap = mpf(0)
        for power, factor in terms:
            q = power + l + 1
            overlap += factor * binomial(m + a, m) * factorial(q) / s ** (q + 1) * hyp2f1(-m, q + 1, a + 1, t / s)
        norm = t ** (2 * l + 2) * factorial(m) / factorial(m + 2 * l + 1)
        term = norm * overlap**2 / ((m + l + 1) * kappa - 1)
        total -= term
        small = small + 1 if abs(term) < abs(total) * mpf(10) ** (-mp.dps) else 0
        m += 1
    return total


def response(level, blocks, w):
    """- sum over blocks of weight <s| (E + w - H)^-1 + (E - w - H)^-1 |s>; the source of a block is r^k times the radial function."""
    energy = -1 / (2 * mpf(level) ** 2)
    return -sum(
        weight * radial(energy + sign * w, l, 1 / mpf(level), terms) for sign in (1, -1) for l, weight, terms in blocks
    )


# Radial functions u = r R: 1s 2 r e^-r; 2s (r - r^2/2) e^(-r/2)/sqrt 2; 2p r^2 e^(-r/2)/(2 sqrt 6).
# Weights are the squares of the angular factors: <00|C(k)_0|k0>^2 = 1/(2k+1); for the average over m of 2p, 1/9 to s and 2/9 to d.
def dipole_1s(w):
    return response(1, [(1, mpf(1) / 3, [(2, mpf(2))])], w)


def quadrupole_1s(w):
    return response(1, [(2, mpf(1) / 5, [(3, mpf(2))])], w)


def dipole_2s(w):
    return response(2, [(1, mpf(1) / 3, [(2, 1 / sqrt(2)), (3, -1 / sqrt(8))])], w)


def dipole_2p(w):
    terms = [(3, 1 / sqrt(24))]
    return response(2, [(0, mpf(1) / 9, terms), (2, mpf(2) / 9, terms)], w)


def show(expression, value):
    # On the imaginary axis the value is real; what is left there of an imaginary part is rounding.
    real = not isinstance(value, mpc) or abs(value.imag) < abs(value) * mpf(10) ** (5 - mp.dps)
    parts = [re(value)] if real else [value.real, value.imag]
    print(expression, *(nstr(part, 60) for part in parts), sep="\t")


def main():
    points = [("1/100", mpf(1) / 100), ("1/10", mpf(1) / 10), ("2/5", mpf(2) / 5), ("9/20", mpf(9) / 20), ("i", mpc(0, 1)),
              ("1/20 i", mpc(0, 1) / 20), ("7/10 + 1/10 i", mpc(7, 1) / 10), ("3/10 - 2 i", mpc(3, -20) / 10)]
    for text, w in points:
        show(f"dipole_1s({text})", dipole_1s(w))
    for text, w in (points[1], points[4]):
        show(f"quadrupole_1s({text})", quadrupole_1s(w))
    for text, w in [("1/20", mpf(1) / 20), ("i", mpc(0, 1)), ("1/5 + 1/50 i", mpc(10, 1) / 50)]:
        show(f"dipole_2s({text})", dipole_2s(w))
    for text, w in [("1/100", mpf(1) / 100), ("1/4 i", mpc(0, 1) / 4)]:
        show(f"dipole_2p({text})", dipole_2p(w))
    for interval, start in [("0.40 .. 0.44", ("0.42", "0.44")), ("0.45 .. 0.465", ("0.46", "0.465"))]:
        root = findroot(dipole_1s, tuple(map(mpf, start)), solver="anderson")
        show(f"zero(w in {interval}, dipole_1s(w))", root)


if __name__ == "__main__":
    main()
