"""The recommended constants and what follows from them, as the tables of CODATA 2018 and 2022 that SciPy carries have them.

Prints lines `set <tab> expression of the session language <tab> value <tab> standard uncertainty`, an uncertainty of 0 for what is exact.
The session language computes what follows from alpha and the Rydberg constant; the tables give it as it came out of the adjustment.
"""

from scipy.constants import _codata

ADJUSTMENTS = {
    "CODATA-2018": _codata._physical_constants_2018,
    "CODATA-2022": _codata._physical_constants_2022,
}

CONSTANTS = {
    "codata.alpha": "fine-structure constant",
    "codata.alpha_inverse": "inverse fine-structure constant",
    "codata.R_inf in m^-1": "Rydberg constant",
    "codata.a_e": "electron mag. mom. anomaly",
    "codata.g_e": "electron g factor",
    "codata.A_r_e": "electron relative atomic mass",
    "codata.m_mu": "muon-electron mass ratio",
    "codata.m_tau": "tau-electron mass ratio",
    "codata.m_p": "proton-electron mass ratio",
    "codata.m_n": "neutron-electron mass ratio",
    "codata.m_d": "deuteron-electron mass ratio",
    "codata.m_t": "triton-electron mass ratio",
    "codata.m_h": "helion-electron mass ratio",
    "codata.m_alpha": "alpha particle-electron mass ratio",
    "codata.r_p in m": "proton rms charge radius",
    "codata.m_e in kg": "electron mass",
    "codata.m_u in kg": "atomic mass constant",
    "codata.c in m/s": "speed of light in vacuum",
    "codata.h in J s": "Planck constant",
    "codata.hbar in J s": "reduced Planck constant",
    "codata.e in C": "elementary charge",
    "codata.k in J/K": "Boltzmann constant",
    "codata.a_0 in m": "Bohr radius",
    "codata.E_h in J": "Hartree energy",
    "codata.mu_B in J/T": "Bohr magneton",
    "codata.epsilon_0 in F/m": "vacuum electric permittivity",
    "codata.mu_0 in N/A^2": "vacuum mag. permeability",
}

CONVERSIONS = {
    "1 hartree in eV": "Hartree energy in eV",
    "1 hartree in Hz": "hartree-hertz relationship",
    "1 hartree in m^-1": "hartree-inverse meter relationship",
    "1 hartree in K": "hartree-kelvin relationship",
    "1 rydberg in J": "Rydberg constant times hc in J",
    "1 rydberg in eV": "Rydberg constant times hc in eV",
    "1 rydberg in Hz": "Rydberg constant times c in Hz",
    "1 eV in Hz": "electron volt-hertz relationship",
    "1 eV in m^-1": "electron volt-inverse meter relationship",
    "1 eV in K": "electron volt-kelvin relationship",
    "1 eV in J": "electron volt-joule relationship",
    "1 eV in hartree": "electron volt-hartree relationship",
    "1 Hz in m^-1": "hertz-inverse meter relationship",
    "1 Hz in K": "hertz-kelvin relationship",
    "1 Hz in hartree": "hertz-hartree relationship",
    "1 m^-1 in hartree": "inverse meter-hartree relationship",
    "1 m^-1 in eV": "inverse meter-electron volt relationship",
    "1 K in hartree": "kelvin-hartree relationship",
    "1 J in Hz": "joule-hertz relationship",
    "1 m_e in u": "electron mass in u",
    "1 hbar/hartree in s": "atomic unit of time",
    "1 bohr hartree/hbar in m/s": "atomic unit of velocity",
    "1 hbar/bohr in kg m/s": "atomic unit of momentum",
    "1 hartree/bohr in N": "atomic unit of force",
    "1 hartree/(e bohr) in V/m": "atomic unit of electric field",
    "1 hartree/(e bohr^2) in V/m^2": "atomic unit of electric field gradient",
    "1 hartree/e in V": "atomic unit of electric potential",
    "1 e hartree/hbar in A": "atomic unit of current",
    "1 e/bohr^3 in C/m^3": "atomic unit of charge density",
    "1 e bohr in C m": "atomic unit of electric dipole mom.",
    "1 e bohr^2 in C m^2": "atomic unit of electric quadrupole mom.",
    "1 e^2 bohr^2/hartree in C m^2/V": "atomic unit of electric polarizability",
    "1 e^3 bohr^3/hartree^2 in C^3 m^3/J^2": "atomic unit of 1st hyperpolarizability",
    "1 e^4 bohr^4/hartree^3 in C^4 m^4/J^3": "atomic unit of 2nd hyperpolarizability",
    "1 hbar/(e bohr^2) in T": "atomic unit of mag. flux density",
    "1 e hbar/m_e in J/T": "atomic unit of mag. dipole mom.",
    "1 e^2 bohr^2/m_e in J/T^2": "atomic unit of magnetizability",
    "codata.mu_B in Hz/T": "Bohr magneton in Hz/T",
    "codata.mu_B in eV/T": "Bohr magneton in eV/T",
    "codata.alpha^2 codata.a_0 in m": "classical electron radius",
    "2 pi codata.alpha codata.a_0 in m": "Compton wavelength",
    "8/3 pi codata.alpha^4 codata.a_0^2 in m^2": "Thomson cross section",
}

for adjustment, table in ADJUSTMENTS.items():
    for expression, name in {**CONSTANTS, **CONVERSIONS}.items():
        value, _, uncertainty = table[name]
        print(adjustment, expression, repr(value), repr(uncertainty), sep="\t")
