"""Chain of particles in double wells, the phi-four chain.

E = sum_i [ C/2 (u_i - u_{i+1})^2 + a/2 u_i^2 + b/4 u_i^4 - h u_i ],  u real, b > 0

Displacive structural transitions in chains and their domain walls; a < 0 makes two wells, at u = +-(-a/b)^(1/2).
Momenta are not part of the energy. The displacements are equal steps from -reach to reach, where the energy of a
site should exceed that of the wells by 40 T; at low temperature more nodes are needed.
"""

from tmsolve import Chain, bond, interval, site


def chain(nodes: int = 64, reach: float = 3.5) -> Chain:
    """Declare the chain with so many displacements per particle, from -reach to reach."""
    return Chain(
        interval(-reach, reach, nodes, "trapezoid"),
        [
            bond(lambda u, v, C: C*(u - v)**2/2),
            site(lambda u, a: a*u*u/2),
            site(lambda u, b: b*u**4/4),
            site(lambda u, h: -h*u),
        ],
        observables={"u": lambda u: u, "u2": lambda u: u*u},
        name="phi-four chain",
    )


DEFAULTS = {"C": 1, "a": -1, "b": 1, "h": 0, "T": "0.5"}

_OWN = "equal steps from u = -4 to 4, the same to 34 digits with 121 and 151 of them, in a program of its own"
_POINT = {"C": 1, "a": -1, "b": 1, "h": 0, "T": "0.5"}

FACTS = (
    {
        "id": "free_energy",
        "statement": "f = -T ln l0, l0 the largest eigenvalue of the kernel",
        "quantity": "free_energy",
        "point": _POINT,
        "value": "-0.3305759077149152477289326824570059",
        "rtol": 1e-12,
        "source": _OWN,
    },
    {
        "id": "correlation_length",
        "statement": "xi = 1/ln(l0/l1)",
        "quantity": "correlation_length(u)",
        "point": _POINT,
        "value": "2.750533517023333045955561591611379",
        "rtol": 1e-11,
        "source": _OWN,
    },
    {
        "id": "mean_square_displacement",
        "statement": "<u^2> in the square of the first eigenfunction",
        "quantity": "mean(u2)",
        "point": _POINT,
        "value": "0.6118052022647011176204763343340148",
        "rtol": 1e-11,
        "source": _OWN,
    },
    {
        "id": "displacement_in_field",
        "statement": "<u> in the square of the first eigenfunction",
        "quantity": "mean(u)",
        "point": {**_POINT, "h": "0.1"},
        "value": "0.5452871454122036571487739942815094",
        "rtol": 1e-11,
        "source": _OWN,
    },
    {
        "id": "free_energy_without_coupling",
        "statement": "f = -T ln[pi/2 exp(z) (I_{-1/4}(z) + I_{1/4}(z))] at C = 0, a = -1, b = 1, z = 1/(8 T)",
        "quantity": "free_energy",
        "point": {**_POINT, "C": 0},
        "value": "-0.713447933940865558204999023663",
        "rtol": 1e-10,
        "source": (
            "I. S. Gradshteyn and I. M. Ryzhik, Table of Integrals, section 3.323; from memory, checked by quadrature "
            "to 30 digits"
        ),
    },
    {
        "id": "equipartition_of_a_quartic_well",
        "statement": "c = 1/4 at C = a = h = 0",
        "quantity": "specific_heat",
        "options": {"reach": 4},
        "point": {"C": 0, "a": 0, "b": 1, "h": 0, "T": 1},
        "value": "0.25",
        "rtol": 1e-9,
        "source": "equipartition of energy for u^4 (textbook)",
    },
)
