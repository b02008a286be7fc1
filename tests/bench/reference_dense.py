"""A chain of three resolvents on a dense symmetric matrix: this program beside python-flint and mpmath, in one run.

    pip install python-flint mpmath gmpy2
    cargo bench --bench dense_chain --no-run
    python tests/bench/reference_dense.py [--order 200] [--digits 64] [--rounds 4] [--no-mpmath] [--threads 1]

The runs alternate (ours, theirs, ours, theirs, ...) so that other work on the machine falls on both; the least time of each
counts. Every value is compared with a rigorous one at higher precision.
"""

import argparse
import glob
import math
import os
import subprocess
import time

import flint
import mpmath

ENTRY_BITS = 320
ENERGIES = ["0.3", "-1.7", "2.9"]
WORD = (1 << 64) - 1


class Irregular:
    """SplitMix (Steele, Lea, Flood 2014), as in dense_chain.rs."""

    def __init__(self, state):
        self.state = state

    def word(self):
        self.state = (self.state + 0x9E3779B97F4A7C15) & WORD
        z = self.state
        z = ((z ^ (z >> 30)) * 0xBF58476D1CE4E5B9) & WORD
        z = ((z ^ (z >> 27)) * 0x94D049BB133111EB) & WORD
        return z ^ (z >> 31)

    def number(self):
        """The numerator over 2^ENTRY_BITS."""
        whole = 0
        for _ in range(ENTRY_BITS // 64):
            whole = (whole << 64) + self.word()
        return whole - (1 << (ENTRY_BITS - 1))


def draw(order):
    random = Irregular(2024)
    h = [[0] * order for _ in range(order)]
    for i in range(order):
        for j in range(i + 1):
            h[i][j] = h[j][i] = random.number()
    return h, [random.number() for _ in range(order)]


def by_flint(h, b, bits, algorithm):
    """The value and the seconds; the matrix is made ready before the clock starts, as in ours."""
    order = len(b)
    flint.ctx.prec = max(bits, ENTRY_BITS)
    unit = flint.arb(2) ** -ENTRY_BITS
    matrix = flint.arb_mat(order, order, [x * unit for row in h for x in row])
    vector = flint.arb_mat(order, 1, [x * unit for x in b])
    flint.ctx.prec = bits
    begin = time.perf_counter()
    x = vector
    for energy in reversed(ENERGIES):
        shifted = -matrix
        for i in range(order):
            shifted[i, i] += flint.arb(energy)
        x = shifted.solve(x, algorithm=algorithm)
        if algorithm == "approx":
            x = x.mid()
    seconds = time.perf_counter() - begin
    return (vector.transpose() * x)[0, 0], seconds


def by_mpmath(h, b, bits):
    order = len(b)
    mpmath.mp.prec = max(bits, ENTRY_BITS)
    unit = mpmath.mpf(2) ** -ENTRY_BITS
    matrix = mpmath.matrix([[x * unit for x in row] for row in h])
    vector = mpmath.matrix([x * unit for x in b])
    mpmath.mp.prec = bits
    begin = time.perf_counter()
    x = vector
    for energy in reversed(ENERGIES):
        shifted = -matrix
        for i in range(order):
            shifted[i, i] += mpmath.mpf(energy)
        x = mpmath.lu_solve(shifted, x)
    seconds = time.perf_counter() - begin
    return mpmath.fdot(vector, x), seconds


def ours(binary, arguments):
    command = [binary, str(arguments.order), str(arguments.digits), "1", str(arguments.threads)]
    seconds, _holds, value = subprocess.run(command, capture_output=True, text=True, check=True).stdout.split()
    return flint.arb(value), float(seconds)


def agreement(value, exact):
    off = abs((value - exact) / exact).mid()
    return 999 if off == 0 else int(-math.log10(float(off)))


def main():
    parser = argparse.ArgumentParser(description=__doc__.splitlines()[0])
    parser.add_argument("--order", type=int, default=200)
    parser.add_argument("--digits", type=int, default=64)
    parser.add_argument("--rounds", type=int, default=4)
    parser.add_argument("--threads", type=int, default=1)
    parser.add_argument("--no-mpmath", action="store_true")
    parser.add_argument("--binary")
    arguments = parser.parse_args()
    here = os.path.dirname(os.path.abspath(__file__))
    built = glob.glob(os.path.join(os.environ.get("CARGO_TARGET_DIR", os.path.join(here, "../../target")), "release/deps/dense_chain-*"))
    built = [path for path in built if os.access(path, os.X_OK) and not path.endswith(".d")]
    binary = arguments.binary or max(built, key=os.path.getmtime)
    bits = math.ceil(arguments.digits * math.log2(10))
    h, b = draw(arguments.order)
    exact, _ = by_flint(h, b, 2 * bits + 200, "precond")
    print(f"order {arguments.order}, {arguments.digits} digits, the exact value is {exact.str(20)}")
    least, digits = {}, {}
    for _ in range(arguments.rounds):
        for name, run in [
            ("ketwork", lambda: ours(binary, arguments)),
            ("python-flint", lambda: by_flint(h, b, bits, "approx")),
        ]:
            value, seconds = run()
            flint.ctx.prec = 2 * bits + 200
            least[name] = min(least.get(name, math.inf), seconds)
            digits[name] = agreement(value, exact)
    if not arguments.no_mpmath:
        value, seconds = by_mpmath(h, b, bits)
        flint.ctx.prec = 2 * bits + 200
        least["mpmath"] = seconds
        mpmath.mp.prec = bits
        digits["mpmath"] = agreement(flint.arb(mpmath.nstr(value, arguments.digits + 6)), exact)
    for name, seconds in least.items():
        ratio = seconds / least["ketwork"]
        print(f"{name:>13}: {seconds:9.4f} s, {digits[name]} digits right, {ratio:8.1f} times the time of ketwork")


if __name__ == "__main__":
    main()
