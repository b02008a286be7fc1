"""3j, 6j and 9j symbols by sympy: one symbol a line in, its signed square out.

Standard input holds lines `3j n1 … n6`, `6j n1 … n6` or `9j n1 … n9` of doubled arguments; the answer is `sign numerator/denominator`
of the square, since every symbol is the square root of a rational.
"""

import sys

from sympy import Rational
from sympy.physics.wigner import wigner_3j, wigner_6j, wigner_9j

SYMBOLS = {"3j": wigner_3j, "6j": wigner_6j, "9j": wigner_9j}


def main():
    for line in sys.stdin:
        kind, *doubled = line.split()
        value = SYMBOLS[kind](*[Rational(int(number), 2) for number in doubled])
        square = value**2
        assert square.is_Rational
        sign = 0 if value == 0 else (1 if value > 0 else -1)
        print(sign, f"{square.p}/{square.q}")


if __name__ == "__main__":
    main()
