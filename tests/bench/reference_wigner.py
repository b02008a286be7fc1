"""Exact Wigner symbols: this program beside sympy (exact) and pywigxjpf (compiled, floating point), in one run.

    target/reference/bin/pip install --requirement tests/reference/requirements.txt pywigxjpf==1.13.3
    cargo bench --bench wigner --no-run
    target/reference/bin/python tests/bench/reference_wigner.py [--rounds 4]

All compute the same random symbols. The runs alternate so that other work on the machine falls on all; the least time of each counts.
A call of the compiled library from Python costs more than a small symbol, so what a call costs that is refused at once, because its
triangle does not close, is taken off; where the two cannot be told apart no ratio is given.
"""

import argparse
import glob
import math
import os
import random
import subprocess
import time

import pywigxjpf
from sympy import Rational
from sympy.physics.wigner import wigner_3j, wigner_6j, wigner_9j

COMPILED = {"3j": pywigxjpf.wig3jj, "6j": pywigxjpf.wig6jj, "9j": pywigxjpf.wig9jj}
SYMPY = {"3j": wigner_3j, "6j": wigner_6j, "9j": wigner_9j}
REFUSED = {"3j": [2, 2, 8, 0, 0, 0], "6j": [2, 2, 8, 2, 2, 2], "9j": [2, 2, 8, 2, 2, 2, 2, 2, 2]}


def third(numbers, a, b):
    return abs(a - b) + 2 * numbers.randint(0, min(a, b))


def common(numbers, first, second):
    low = max(abs(first[0] - first[1]), abs(second[0] - second[1]))
    high = min(sum(first), sum(second))
    return None if low > high or (low + sum(first)) % 2 else low + 2 * numbers.randint(0, (high - low) // 2)


def draw(numbers, kind, low, high):
    """Doubled arguments with all triangles closed, the free ones between two bounds."""
    def momentum():
        return numbers.randint(low, high)

    while True:
        if kind == "3j":
            a, b = momentum(), momentum()
            c = third(numbers, a, b)
            m, n = numbers.randrange(-a, a + 1, 2), numbers.randrange(-b, b + 1, 2)
            if abs(m + n) <= c:
                return [a, b, c, m, n, -m - n]
        elif kind == "6j":
            a, b, d = momentum(), momentum(), momentum()
            c = third(numbers, a, b)
            e = third(numbers, d, c)
            f = common(numbers, (d, b), (a, e))
            if f is not None:
                return [a, b, c, d, e, f]
        else:
            a, b, d, e = momentum(), momentum(), momentum(), momentum()
            c, f, g, h = third(numbers, a, b), third(numbers, d, e), third(numbers, a, d), third(numbers, b, e)
            i = common(numbers, (c, f), (g, h))
            if i is not None:
                return [a, b, c, d, e, f, g, h, i]


def loop(call, arguments, repeats):
    begin = time.perf_counter()
    for _ in range(repeats):
        for own in arguments:
            call(*own)
    return (time.perf_counter() - begin) / repeats / len(arguments)


def ours(binary, kind, arguments, repeats):
    text = "\n".join(f"{kind} " + " ".join(map(str, own)) for own in arguments)
    run = subprocess.run([binary, str(repeats), "--bench"], input=text, capture_output=True, text=True, check=True)
    seconds, *values = run.stdout.splitlines()
    return float(seconds), values


def as_float(text):
    """A rational times a root, as this program writes it."""
    value = 1.0
    for word in text.split(" "):
        if word.lstrip("-").startswith("sqrt"):
            value *= (-1 if word.startswith("-") else 1) * math.sqrt(int(word[word.index("(") + 1 : -1]))
        else:
            numerator, _, denominator = word.partition("/")
            value *= int(numerator) / int(denominator or "1")
    return value


def report(binary, kind, name, arguments, rounds, repeats, sympy_count):
    best = dict.fromkeys(("ketwork", "call", "refused", "sympy"), math.inf)
    for _ in range(rounds):
        seconds, values = ours(binary, kind, arguments, repeats)
        best["ketwork"] = min(best["ketwork"], seconds)
        best["call"] = min(best["call"], loop(COMPILED[kind], arguments, repeats))
        best["refused"] = min(best["refused"], loop(COMPILED[kind], [REFUSED[kind]] * len(arguments), repeats))
        if sympy_count:
            rationals = [[Rational(x, 2) for x in own] for own in arguments[:sympy_count]]
            best["sympy"] = min(best["sympy"], loop(SYMPY[kind], rationals, 1))
    for own, value in zip(arguments, values):
        expected = COMPILED[kind](*own)
        assert math.isclose(as_float(value), expected, rel_tol=1e-9, abs_tol=1e-12), (kind, own, value, expected)
    line = f"{kind} {name}: ketwork {best['ketwork'] * 1e6:.2f} us"
    line += f"; pywigxjpf {best['call'] * 1e6:.2f} us a call, {best['refused'] * 1e6:.2f} us of it the call"
    if best["call"] > 1.2 * best["refused"]:
        line += f": ketwork {best['ketwork'] / (best['call'] - best['refused']):.1f} times that"
    if sympy_count:
        line += f"; sympy {best['sympy'] / best['ketwork']:.0f} times ketwork"
    print(line, flush=True)


def main():
    parser = argparse.ArgumentParser()
    parser.add_argument("--rounds", type=int, default=4)
    rounds = parser.parse_args().rounds
    folder = os.environ.get("CARGO_TARGET_DIR", "target")
    binaries = [p for p in glob.glob(os.path.join(folder, "release/deps/wigner-*")) if os.access(p, os.X_OK)]
    binary = max(binaries, key=os.path.getmtime)
    pywigxjpf.wig_table_init(2 * 900, 9)
    pywigxjpf.wig_temp_init(2 * 900)
    numbers = random.Random(9)
    for kind in ("3j", "6j", "9j"):
        for name, low, high, count, repeats in (("j up to 3", 0, 6, 200, 20), ("j about 10", 18, 22, 200, 20),
                                                ("j about 50", 98, 102, 20, 5)):
            arguments = [draw(numbers, kind, low, high) for _ in range(count)]
            sympy_count = {"3j": 50, "6j": 50, "9j": 5}[kind] if high < 50 else 0
            report(binary, kind, name, arguments, rounds, repeats, sympy_count)
    report(binary, "6j", "all j = 10", [[20] * 6] * 100, rounds, 20, 20)
    report(binary, "6j", "all j = 200", [[400] * 6], rounds, 5, 0)


if __name__ == "__main__":
    main()
