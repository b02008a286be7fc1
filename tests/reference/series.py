"""Perturbation series in rational arithmetic, by another way than the program's, compared with the records of session files.

No basis and no resolvent: the perturbed functions are polynomials, found power by power from the differential equation, and each energy is
the number for which that equation has a solution.

Hydrogen 1s: psi = e^-r sum_l r^l P_l(cos theta) f_l(r). With f = sum_n c_n r^n
    (H - E) psi  <->  coefficient of r^(n-1):  (n + l) c_n - (n + 1) (n/2 + l + 1) c_(n+1),
solved from the highest power down; for l = 0 the power r^-1 has no free coefficient and fixes the energy.
Oscillator: psi = e^(-x^2/2) sum_m c_m x^m, (H - E) psi <-> coefficient of x^m: (m - level) c_m - (m + 1)(m + 2)/2 c_(m+2).
Rotor: psi = sum_J c_J P_J(cos theta), (H - E) psi <-> J (J + 1) c_J.

Prints the number of records that were compared; ends with an error at the first that differs.
"""

import sys
from fractions import Fraction
from math import factorial
from pathlib import Path

ROOT = Path(__file__).resolve().parents[2]


# Hydrogen. A function is {l: {power of r: coefficient}}.

def add(target, source, factor):
    for l, radial in source.items():
        for power, c in radial.items():
            row = target.setdefault(l, {})
            row[power] = row.get(power, 0) + factor * c
            if row[power] == 0:
                del row[power]


def times_r(f, exponent):
    return {l: {p + exponent: c for p, c in radial.items()} for l, radial in f.items()}


def times_z(f):
    product = {}
    for l, radial in f.items():
        add(product, {l + 1: radial}, Fraction(l + 1, 2 * l + 1))
        if l > 0:
            add(product, {l - 1: {p + 2: c for p, c in radial.items()}}, Fraction(l, 2 * l + 1))
    return product


def solve(source):
    """(H - E) f = source - energy * ground state; returns energy and f, without an admixture of the ground state's constant."""
    solution, energy = {}, Fraction(0)
    for l, radial in source.items():
        if l == 0:
            energy, level = solvable(radial)
        else:
            level = descend(radial, l, -1)
        solution[l] = {n: c for n, c in level.items() if c != 0}
    return energy, solution


def descend(radial, l, lowest):
    level, top = {}, max(radial, default=lowest) + 1
    for n in range(top, max(lowest, -1), -1):
        above = level.get(n + 1, Fraction(0))
        level[n] = (radial.get(n - 1, Fraction(0)) + (n + 1) * (Fraction(n, 2) + l + 1) * above) / (n + l)
    return level


def solvable(radial):
    # The rest at r^-1 is linear in the energy that is taken away at r^0.
    def rest(energy):
        shifted = dict(radial)
        shifted[0] = shifted.get(0, Fraction(0)) - energy
        level = descend(shifted, 0, 0)
        return shifted.get(-1, Fraction(0)) + level.get(1, Fraction(0)), level

    at0, at1 = rest(Fraction(0))[0], rest(Fraction(1))[0]
    energy = at0 / (at0 - at1)
    return energy, rest(energy)[1]


GROUND = {0: {0: Fraction(1)}}


def hydrogen(perturbation, order):
    """Energies E_0 .. E_order of hydrogen 1s under lambda V."""
    psi, energies = [GROUND], [Fraction(-1, 2)]
    for k in range(1, order + 1):
        source = {}
        add(source, perturbation(psi[k - 1]), Fraction(1))
        for j in range(1, k):
            add(source, psi[k - j], -energies[j])
        energy, f = solve(source)
        energies.append(energy)
        psi.append({l: {p: -c for p, c in radial.items()} for l, radial in f.items()})
    return energies


def mixed(first, second, i, j):
    """The coefficient of a^i b^j of the energy of 1s under a V + b W."""
    psi, energies = {(0, 0): GROUND}, {(0, 0): Fraction(0)}
    for a in range(i + 1):
        for b in range(j + 1):
            if a + b == 0:
                continue
            source = {}
            if a > 0:
                add(source, first(psi[a - 1, b]), Fraction(1))
            if b > 0:
                add(source, second(psi[a, b - 1]), Fraction(1))
            for (c, d), energy in energies.items():
                if c <= a and d <= b and (c, d) != (0, 0) and (c, d) != (a, b):
                    add(source, psi[a - c, b - d], -energy)
            energies[a, b], f = solve(source)
            psi[a, b] = {l: {p: -x for p, x in radial.items()} for l, radial in f.items()}
    return energies[i, j]


def overlap(f, g):
    """<f|g> over the norm of 1s: int r^(2l+2) f g e^-2r dr / (2l+1), times 4."""
    total = Fraction(0)
    for l in f.keys() & g.keys():
        for p, c in f[l].items():
            for q, d in g[l].items():
                n = 2 * l + 2 + p + q
                total += c * d * Fraction(4 * factorial(n), (2 * l + 1) * 2 ** (n + 1))
    return total


def strengths(power):
    """S(-power) = 2 <z (H - E)^(1-power) ... z>: the sum of f Delta^-power, f = 2 Delta |z|^2."""
    ket = times_z(GROUND)
    source = ket
    for _ in range(power - 1):
        ket = solve(ket)[1]
    return 2 * overlap(source, ket)


def multipole(L):
    """The 2^L-pole polarizability: 2 <r^L P_L (H - E)^-1 r^L P_L>."""
    source = {L: {0: Fraction(1)}}
    return 2 * overlap(source, solve(source)[1])


# One dimension. A function is {power: coefficient}.

def oscillator(power, level, order):
    hermite = {level: Fraction(1)}
    for m in range(level - 2, -1, -2):
        hermite[m] = Fraction((m + 1) * (m + 2), 2) * hermite[m + 2] / (m - level)
    psi, energies = [hermite], [Fraction(2 * level + 1, 2)]

    def rest(source, energy):
        c, top = {}, max(source, default=level)
        for m in range(max(top, level), -1, -1):
            right = source.get(m, 0) - energy * hermite.get(m, 0) + Fraction((m + 1) * (m + 2), 2) * c.get(m + 2, 0)
            if m == level:
                misfit, c[m] = right, Fraction(0)
            else:
                c[m] = right / (m - level)
        return misfit, c

    for k in range(1, order + 1):
        source = {m + power: c for m, c in psi[k - 1].items()}
        for j in range(1, k):
            for m, c in psi[k - j].items():
                source[m] = source.get(m, 0) - energies[j] * c
        at0, at1 = rest(source, 0)[0], rest(source, 1)[0]
        energies.append(at0 / (at0 - at1))
        psi.append({m: -c for m, c in rest(source, energies[k])[1].items()})
    return energies


def rotor(order):
    """J (J + 1) - lambda cos, lowest level."""
    psi, energies = [{0: Fraction(1)}], [Fraction(0)]
    for k in range(1, order + 1):
        source = {}
        for l, c in psi[k - 1].items():
            source[l + 1] = source.get(l + 1, 0) - c * Fraction(l + 1, 2 * l + 1)
            if l > 0:
                source[l - 1] = source.get(l - 1, 0) - c * Fraction(l, 2 * l + 1)
        for j in range(1, k):
            for l, c in psi[k - j].items():
                source[l] = source.get(l, 0) - energies[j] * c
        energies.append(source.get(0, Fraction(0)))
        psi.append({l: -c / (l * (l + 1)) for l, c in source.items() if l > 0})
    return energies


def magnetic(f):
    product = {}
    add(product, times_r(f, 2), Fraction(1, 8))
    add(product, times_z(times_z(f)), Fraction(-1, 8))
    return product


def gradient(f):
    """(3 z^2 - r^2)/4."""
    product = {}
    add(product, times_z(times_z(f)), Fraction(3, 4))
    add(product, times_r(f, 2), Fraction(-1, 4))
    return product


def expected():
    stark = hydrogen(times_z, 8)
    yield "hydrogen-series.ketwork", [
        *(stark[k] for k in (2, 4, 6, 8)),
        *hydrogen(magnetic, 3)[1:],
        *hydrogen(lambda f: times_r(f, 1), 4)[1:],
        *hydrogen(lambda f: times_r(f, 2), 3)[1:],
        *(multipole(L) for L in range(1, 7)),
    ]
    yield "hydrogen-third-order.ketwork", [
        strengths(3) / 2,
        -2 * mixed(times_z, lambda f: times_r(f, -1), 2, 1),
        mixed(times_z, gradient, 2, 1),
        *(strengths(k) for k in range(1, 7)),
    ]
    quartic, excited, cubic, rigid = oscillator(4, 0, 6), oscillator(4, 1, 4), oscillator(3, 0, 4), rotor(6)
    yield "quartic-oscillator.ketwork", quartic[1:]
    yield "model-series.ketwork", [*excited[1:], *cubic[1:], *(rigid[k] for k in (2, 4, 6))]


def records(name):
    """The exact values recorded in a session file, in order; sentences such as `holds` are left out."""
    for line in (ROOT / "tests/sessions" / name).read_text().splitlines():
        if line.startswith("  = "):
            try:
                yield Fraction(line[4:])
            except ValueError:
                continue


def main():
    compared = 0
    for name, values in expected():
        found = iter(records(name))
        for value in values:
            # Every value stands in the file, in this order; entries in between are other checks.
            if not any(record == value for record in found):
                sys.exit(f"{name}: {value} is not among the records, or not in its place")
            compared += 1
    print(compared)


if __name__ == "__main__":
    main()
