"""The dynamic polarizability of hydrogen 1s at w = 1/10: this program beside mpmath and python-flint, in one run.

    target/reference/bin/pip install --requirement tests/reference/requirements.txt
    cargo bench --bench polarizability --no-run
    target/reference/bin/python tests/bench/reference_polarizability.py [--rounds 4]

All do the same: the l = 1 block of H - E S in Coulomb Sturmian functions of exponent 1 is tridiagonal; it is solved for the source
r u_1s, which is a combination of the first two functions, at growing sizes until two values agree to the digits asked. The runs
alternate so that other work on the machine falls on all; the least time of each counts.

Normalised so that <n|1/r|n> = 1 the functions of l = 1 have (physics textbooks; derived anew)
    <n|1|n> = n, <n|1|n+1> = -1/2 sqrt((n-1)(n+2)),   H - E S = -(1/2 + E) S + n - 1 on the diagonal,
and r u_1s has the overlaps b_2 = sqrt(6), b_3 = -sqrt(24)/4 ..., computed here from the closed integral.
"""

import argparse
import glob
import math
import os
import subprocess
import time

import flint
import mpmath


def overlaps(number, sqrt, size):
    """<n| r |1s> of the first functions: u_1s = 2 r e^-r, u_n = N r^2 e^-r L^3_{n-2}(2 r), N^2 = 16 (n-2)!/(n+1)!."""
    values = []
    for n in range(2, size + 2):
        m = n - 2
        # int r^4 e^-2r L^3_m(2r) dr = (3-4)_m/m! 4!/2^5: zero from m = 2 on
        pochhammer = [1, -1]
        if m > 1:
            values.append(number(0))
            continue
        norm = sqrt(number(16 * math.factorial(m)) / number(math.factorial(n + 1)))
        values.append(norm * 2 * number(pochhammer[m]) * number(24) / number(32))
    return values


def half(number, sqrt, energy, size):
    """-<r (E - H)^-1 r>/3 in a basis of the given size."""
    b = overlaps(number, sqrt, size)
    shift = -(number(1) / 2 + energy)
    diagonal = [shift * n + n - 1 for n in range(2, size + 2)]
    off = [shift * (-sqrt(number((n - 1) * (n + 2))) / 2) for n in range(2, size + 1)]
    x = list(b)
    for k in range(1, size):
        factor = off[k - 1] / diagonal[k - 1]
        diagonal[k] = diagonal[k] - factor * off[k - 1]
        x[k] = x[k] - factor * x[k - 1]
    x[-1] = x[-1] / diagonal[-1]
    for k in range(size - 2, -1, -1):
        x[k] = (x[k] - off[k] * x[k + 1]) / diagonal[k]
    total = number(0)
    for left, right in zip(b, x):
        total = total + left * right
    return total / 3


def polarizability(number, sqrt, close):
    size, before = 8, None
    while True:
        w = number(1) / 10
        value = half(number, sqrt, -number(1) / 2 + w, size) + half(number, sqrt, -number(1) / 2 - w, size)
        if before is not None and close(value, before):
            return value
        size, before = 2 * size, value


def by_mpmath(digits):
    mpmath.mp.dps = digits + 20
    begin = time.perf_counter()
    value = polarizability(mpmath.mpf, mpmath.sqrt, lambda a, b: abs(a - b) < mpmath.mpf(10) ** (-digits))
    return time.perf_counter() - begin, mpmath.nstr(value, digits)


def by_flint(digits):
    flint.ctx.prec = int((digits + 20) * 3.3219281) + 1
    small = flint.arb(10) ** (-digits)
    begin = time.perf_counter()
    value = polarizability(flint.arb, lambda x: x.sqrt(), lambda a, b: abs((a - b).mid()) < small)
    return time.perf_counter() - begin, value.mid().str(digits, radius=False)


def ours(binary, digits):
    output = subprocess.run([binary, str(digits), "3", "--bench"], capture_output=True, text=True, check=True).stdout
    rows = [line.split() for line in output.splitlines()]
    return min(float(row[0]) for row in rows), rows[-1][1]


def main():
    parser = argparse.ArgumentParser()
    parser.add_argument("--rounds", type=int, default=4)
    rounds = parser.parse_args().rounds
    folder = os.environ.get("CARGO_TARGET_DIR", "target")
    binaries = [p for p in glob.glob(os.path.join(folder, "release/deps/polarizability-*")) if os.access(p, os.X_OK)]
    binary = max(binaries, key=os.path.getmtime)
    for digits in (50, 100, 500):
        best = {}
        for _ in range(rounds):
            for name, run in (("ketwork", lambda: ours(binary, digits)), ("mpmath", lambda: by_mpmath(digits)),
                              ("python-flint", lambda: by_flint(digits))):
                seconds, value = run()
                assert value[: digits - 2] == best.get("value", value)[: digits - 2], (name, value, best["value"])
                best["value"] = value
                best[name] = min(seconds, best.get(name, math.inf))
        print(f"{digits} digits: ketwork {best['ketwork'] * 1e3:.3f} ms, mpmath {best['mpmath'] / best['ketwork']:.1f} times that, "
              f"python-flint {best['python-flint'] / best['ketwork']:.1f} times that")


if __name__ == "__main__":
    main()
