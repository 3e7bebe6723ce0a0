"""Harmonic chain: masses joined by springs, each held by a spring of its own.

E = sum_i [ k/2 (x_i - x_{i+1})^2 + p/2 x_i^2 + g/4 (x_i - x_{i+1})^4 - f x_i ],  x real

Displacements of atoms in a chain on a substrate, or of a pinned string. With the option `alternating` a cell has
two masses, joined inside by k and to the next cell by k2. Momenta are not part of the energy: they add
-T/2 ln(2 pi m T) to the free energy per mass, and 1/2 to the specific heat.
The displacements are the nodes of the rule of Gauss and Hermite, whose `scale` is best near
(2/(a + s))^(1/2), a = (k + p/2)/T, s = (p (4k + p))^(1/2)/(2T); p > 0, else nothing holds the chain.
"""

from tmsolve import Chain, bond, line, site


def chain(nodes: int = 48, scale: float = 1.0, alternating: bool = False) -> Chain:
    """Declare the chain with so many displacements per mass."""
    states = line(nodes, scale)
    observables = {"x": lambda x: x, "x2": lambda x: x*x}
    held = [site(lambda x, p: p*x*x/2), site(lambda x, f: -f*x)]
    if not alternating:
        springs = [bond(lambda x, y, k: k*(x - y)**2/2), bond(lambda x, y, g=0: g*(x - y)**4/4)]
        return Chain(states, [*springs, *held], observables, name="harmonic chain")
    inside, across = ("a", "b"), ("b", "a")
    springs = [
        bond(lambda x, y, k: k*(x - y)**2/2, inside, shift=0),
        bond(lambda x, y, k2=1: k2*(x - y)**2/2, across, shift=1),
        bond(lambda x, y, g=0: g*(x - y)**4/4, inside, shift=0),
        bond(lambda x, y, g=0: g*(x - y)**4/4, across, shift=1),
    ]
    return Chain({"a": states, "b": states}, [*springs, *held], observables, name="alternating harmonic chain")


DEFAULTS = {"k": 1, "g": 0, "p": "0.5", "f": 0, "T": 1}

_MEHLER = (
    "F. G. Mehler, J. reine angew. Math. 66, 161 (1866); D. J. Scalapino, M. Sears and R. A. Ferrell, "
    "Phys. Rev. B 6, 3409 (1972); from memory"
)
_GAUSSIAN = "determinant of the quadratic form, mode by mode (common practice, no source)"
_POINT = {"k": "0.9", "p": "0.8", "f": 0, "T": 1}
_ALTERNATING = {"k": 1, "k2": "0.5", "p": "0.8", "f": 0, "T": "0.7"}
_NODES = {"nodes": 48, "alternating": True}

FACTS = (
    {
        "id": "free_energy",
        "statement": "f = -T ln (2 pi/(a + s))^(1/2), a = (k + p/2)/T, b = k/T, s = (a^2 - b^2)^(1/2)",
        "quantity": "free_energy",
        "point": _POINT,
        "value": "-0.5161286513116411758058543814279899",
        "rtol": 1e-12,
        "source": _MEHLER,
    },
    {
        "id": "correlation_length",
        "statement": "eigenvalues fall by b/(a + s) each, so xi = 1/ln((a + s)/b)",
        "quantity": "correlation_length(x)",
        "point": _POINT,
        "value": "1.09771860331647674602031962766508",
        "rtol": 1e-11,
        "source": _MEHLER,
    },
    {
        "id": "mean_square_displacement",
        "statement": "<x^2> = 1/(2 s)",
        "quantity": "mean(x2)",
        "point": _POINT,
        "value": "0.5330017908890260857460943310846",
        "rtol": 1e-12,
        "source": _MEHLER,
    },
    {
        "id": "equipartition",
        "statement": "c = 1/2 per mass at any temperature",
        "quantity": "specific_heat",
        "point": {**_POINT, "T": "1.3"},
        "value": "0.5",
        "rtol": 1e-11,
        "source": "equipartition of energy (textbook)",
    },
    {
        "id": "compliance",
        "statement": "a uniform force moves every mass by f/p",
        "quantity": "mean(x)",
        "point": {**_POINT, "f": "0.4"},
        "value": "0.5",
        "rtol": 1e-12,
        "source": "equilibrium of forces (textbook)",
    },
    {
        "id": "free_energy_of_alternating_springs",
        "statement": (
            "f = -T [ln(2 pi T) - ln((A + (A^2 - B^2)^(1/2))/2)/2] per cell, "
            "A = (k + k2 + p)^2 - k^2 - k2^2, B = 2 k k2"
        ),
        "options": _NODES,
        "quantity": "free_energy",
        "point": _ALTERNATING,
        "value": "-0.5536443790162556440523020567402462",
        "rtol": 1e-12,
        "source": _GAUSSIAN,
    },
    {
        "id": "correlation_length_of_alternating_springs",
        "statement": "xi = 1/arcosh(A/B) cells",
        "options": _NODES,
        "quantity": "correlation_length(x)",
        "point": _ALTERNATING,
        "value": "0.482227425623664379310008768885",
        "rtol": 1e-11,
        "source": _GAUSSIAN,
    },
)
