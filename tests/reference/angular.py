"""Wigner 3j symbols by sympy, written as expectations of the session language: one `expect threej(...) = value` a line.

The argument is the number of random symbols; their seed is fixed. Half of all are forced onto the selection rules, so that most of them are
not zero.
"""

import random
import sys

from sympy import Rational
from sympy.physics.wigner import wigner_3j


def written(value):
    """A rational times a square root, as the session language writes it."""
    sign = "-" if value < 0 else ""
    square = value**2
    assert square.is_Rational
    return f"{sign}sqrt({square.p}/{square.q})"


def symbol(j, m):
    arguments = ", ".join(str(number) for number in (*j, *m))
    return f"expect threej({arguments}) = {written(wigner_3j(*j, *m))}"


def draw(numbers, largest, allowed):
    """Three angular momenta whose sum is whole, with projections; `allowed`: those that the selection rules let be."""
    def projection(doubled):
        return numbers.randrange(-doubled, doubled + 1, 2)

    a, b = numbers.randrange(largest + 1), numbers.randrange(largest + 1)
    c = numbers.randrange(abs(a - b), a + b + 1, 2) if allowed else numbers.randrange((a + b) % 2, largest + 1, 2)
    ma, mb = projection(a), projection(b)
    mc = -ma - mb if allowed else projection(c)
    if allowed and abs(mc) > c:
        return draw(numbers, largest, allowed)
    return [Rational(x, 2) for x in (a, b, c)], [Rational(x, 2) for x in (ma, mb, mc)]


def main():
    count = int(sys.argv[1]) if len(sys.argv) > 1 else 200
    numbers = random.Random(20)
    for position in range(count):
        print(symbol(*draw(numbers, 12, allowed=position % 2 == 0)))
    for j, m in [((40, 40, 40), (0, 0, 0)), ((40, 40, 40), (7, -20, 13)), ((60, 30, 30), (-3, 1, 2))]:
        print(symbol([Rational(x) for x in j], [Rational(x) for x in m]))


if __name__ == "__main__":
    main()
