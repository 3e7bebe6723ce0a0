"""Values from outside this code, each with its source, and a sum over all configurations of one realisation."""

from itertools import product

import mpmath

#: Random-field Ising chain, J = T = 1, fields of unit variance (normal): ln Z per cell, energy, specific heat and
#: susceptibility at mean field 0, magnetisation at mean field 0.3. Quadrature of the law of the cavity field with 200,
#: 300 and 400 nodes, the same to all digits given.
RANDOM_FIELD = {"growth": 1.440342124508, "u": -1.1633853, "c": 0.314114, "chi": 1.58487, "m_at_0.3": 0.44332042}

#: Random-field chain, J = 1, fields +-h with equal chance: -f at (h, T). Invariant function on grids of 4001 and 8001
#: points; products of 1.2e7 random matrices agree to 3e-5. Method: B. Derrida and H. J. Hilhorst, J. Phys. A 16, 2641
#: (1983), from memory.
TWO_FIELDS = {("0.5", "1"): 1.2294290434, ("1", "0.5"): 1.3683378664, ("1.5", "0.3"): 1.6787726818}

#: The same chain at T = 0: energy per site by field. B. Derrida, J. Vannimenus and Y. Pomeau, J. Phys. C 11, 4749
#: (1978), from memory; as rationals: -5/2, -5/3, -37/30, -28/25, -16/15, -291/280.
COLD_ENERGIES = {
    "2.5": "-5/2", "1.5": "-5/3", "0.8": "-37/30", "0.55": "-28/25", "0.4": "-16/15", "0.3": "-291/280",
}  # fmt: skip

#: +-J chain at h = 0, K = 0.8, chance 0.7 of a ferromagnetic bond: -f/T, and T chi = (1 + (2p-1)t)/(1 - (2p-1)t), and
#: sum over r of the squared correlation (1 + t^2)/(1 - t^2). K. H. Fischer and J. A. Hertz, Spin Glasses (1991), from
#: memory.
SIGNED_BONDS = {"growth": 0.98390074088833882971, "chi": 1.7233660887257806272, "glass": 2.5774644711948851061}

#: Chain of normal bonds of unit variance at h = 0, T = 1: -f = E ln 2cosh J, energy -E J tanh J; T = 0: -sqrt(2/pi)
#: sum over r of the squared correlation (1 + q)/(1 - q), q = E tanh^2 J.
NORMAL_BONDS = {
    "growth": 1.067714388051383, "u": -0.6057055096021588, "cold": -0.7978845608028654, "glass": 2.301934633735865,
}  # fmt: skip

#: Bonds present with chance p = 0.8, K = 1.2: T chi = (1 + pt)/(1 - pt), -f/T = ln 2 + p ln cosh K; sites present with
#: chance p: T chi per site = p(1 + pt)/(1 - pt). M. F. Thorpe, J. Physique 36, 1177 (1975), from memory.
DILUTED = {"chi_bonds": 5.0046299108994532091, "growth": 1.1680983578351488047, "chi_sites": 4.0037039287195625672}


def open_realisation(bonds, fields, temperature):
    """Return ln Z and its wanted derivatives of an Ising chain with a free spin before the first bond.

    The chain has one spin more than bonds, the first one without a field; H is added to every field. Differentiated
    numerically with 60 digits.
    """
    with mpmath.workdps(60):

        def log_z(T, H):
            total = mpmath.mpf(0)
            for spins in product((-1, 1), repeat=len(bonds) + 1):
                energy = mpmath.mpf(0)
                for i, (bond, field) in enumerate(zip(bonds, fields, strict=True)):
                    energy -= mpmath.mpf(bond) * spins[i] * spins[i + 1] + (mpmath.mpf(field) + H) * spins[i + 1]
                total += mpmath.exp(-energy / T)
            return mpmath.log(total / 2)

        t = mpmath.mpf(temperature)

        def f(T, H):
            return -T * log_z(T, H)

        return {
            "f": float(f(t, 0)),
            "s": float(-mpmath.diff(lambda T: f(T, 0), t)),
            "c": float(-t * mpmath.diff(lambda T: f(T, 0), t, 2)),
            "m": float(-mpmath.diff(lambda H: f(t, H), 0)),
            "chi": float(-mpmath.diff(lambda H: f(t, H), 0, 2)),
            "f_TH": float(mpmath.diff(f, (t, 0), (1, 1))),
        }
