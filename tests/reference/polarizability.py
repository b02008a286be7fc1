"""Dynamic polarizability of hydrogen 1s by another way than the program's.

The resolvent of the l = 1 block is diagonal in the Sturmian functions u_n of exponent kappa = sqrt(-2 E),
    (-1/2 d^2/dr^2 + 1/r^2 + kappa^2/2) u_n = (n kappa/r) u_n,   int u_n u_m / r dr = delta_nm,
so that (E - H)^-1 = - sum_n u_n u_n / (n kappa - 1) (Rotenberg, Adv. At. Mol. Phys. 6, 233 (1970), derived here anew), and
    alpha(w) = 1/3 sum_{E = -1/2 +- w} sum_{n >= 2} b_n^2 / (n kappa - 1),   b_n = int u_n r 2 r e^-r dr.
With u_n = N r^2 e^{-kappa r} L^3_{n-2}(2 kappa r), N^2 = (2 kappa)^4 (n-2)!/(n+1)!, and
    int r^3 e^{-s r} L^3_m(t r) dr = (m+3)!/m! (s-t)^m / s^{m+4}
differentiated once in s. The series is geometric. No linear system is solved, and the exponent follows the energy.

Prints lines `name value` with 60 digits.
"""

from mpmath import mp, mpf, mpc, sqrt, findroot, nstr, factorial

mp.dps = 80


def half(energy):
    kappa = sqrt(-2 * energy)
    s, t = 1 + kappa, 2 * kappa
    total, n = mpf(0), 2
    while True:
        m = n - 2
        front = factorial(m + 3) / factorial(m)
        integral = front * ((m + 4) * (s - t) ** m / s ** (m + 5))
        if m > 0:
            integral -= front * m * (s - t) ** (m - 1) / s ** (m + 4)
        norm2 = t**4 * factorial(m) / factorial(m + 3)
        term = norm2 * (2 * integral) ** 2 / (n * kappa - 1)
        total += term
        if n > 4 and abs(term) < abs(total) * mpf(10) ** (-mp.dps):
            return total / 3
        n += 1


def alpha(w):
    return half(mpf(-1) / 2 + w) + half(mpf(-1) / 2 - w)


def show(name, value):
    if isinstance(value, mpc) and value.imag != 0:
        print(name, nstr(value.real, 60), nstr(value.imag, 60))
    else:
        print(name, nstr(mp.re(value), 60))


if __name__ == "__main__":
    show("pol(0)", alpha(mpf(10) ** -75))
    for text, w in [
        ("pol(1/100)", mpf(1) / 100),
        ("pol(1/10)", mpf(1) / 10),
        ("pol(2/5)", mpf(2) / 5),
        ("pol(9/20)", mpf(9) / 20),
        ("pol(i)", mpc(0, 1)),
        ("pol(7/10 + 1/10 i)", mpc(7, 1) / 10),
        ("pol(3/10 - 2 i)", mpc(mpf(3) / 10, -2)),
    ]:
        show(text, alpha(w))
    show("zero(w in 0.40 .. 0.44, pol(w))", findroot(alpha, (mpf("0.42"), mpf("0.44")), solver="anderson"))
    show("zero(w in 0.45 .. 0.465, pol(w))", findroot(alpha, (mpf("0.46"), mpf("0.465")), solver="anderson"))
