"""Classical XY chain: planar spins of unit length.

E = sum_i [ -J cos(a_i - a_{i+1}) - h cos(a_i) ],  0 <= a < 2 pi

Easy-plane magnets with chain structure; phases of coupled oscillators or of weakly linked superconductors.
The angles are the nodes of a rule of equal steps; at low temperature more nodes are needed, about
10 (J/T)^(1/2).
"""

from math import cos, sin

from tmsolve import Chain, bond, circle, site


def chain(nodes: int = 48) -> Chain:
    """Declare the chain with so many angles per site."""
    return Chain(
        circle(nodes),
        [
            bond(lambda a, b, J: -J*cos(a - b)),
            site(lambda a, h: -h*cos(a)),
        ],
        observables={"mx": lambda a: cos(a), "my": lambda a: sin(a), "q": lambda a: cos(2*a)},
        name="XY chain",
    )


DEFAULTS = {"J": 1, "h": 0, "T": "0.5"}

_JOYCE = "G. S. Joyce, Phys. Rev. 155, 478 (1967); from memory"
_POINT = {"J": 1, "h": 0, "T": 1}

FACTS = (
    {
        "id": "free_energy_without_field",
        "statement": "f = -T ln(2 pi I0(J/T)) at h = 0",
        "quantity": "free_energy",
        "point": _POINT,
        "value": "-2.073791424916524132250074319011187",
        "rtol": 1e-13,
        "source": _JOYCE,
    },
    {
        "id": "internal_energy_without_field",
        "statement": "u = -J I1(J/T)/I0(J/T) at h = 0",
        "quantity": "internal_energy",
        "point": _POINT,
        "value": "-0.4463899658965345070476817951926427",
        "rtol": 1e-12,
        "source": _JOYCE,
    },
    {
        "id": "internal_energy_of_two_components",
        "statement": "u = -J I_{n/2}(K)/I_{n/2-1}(K), n = 2, K = J/T",
        "quantity": "internal_energy",
        "point": {"J": "1.5", "h": 0, "T": 1},
        "value": "-0.8941998582469360577816389628136688",
        "rtol": 1e-12,
        "source": "H. E. Stanley, Phys. Rev. 179, 570 (1969); from memory",
    },
    {
        "id": "curie_product_without_field",
        "statement": "T chi = (1 + u)/(2(1 - u)), u = I1(J/T)/I0(J/T), at h = 0",
        "quantity": "temperature_susceptibility(mx)",
        "point": _POINT,
        "value": "1.30632564151304314521951127486146",
        "rtol": 1e-12,
        "source": _JOYCE,
    },
    {
        "id": "specific_heat_without_field",
        "statement": "c = K^2 (1 - u/K - u^2), u = I1(K)/I0(K), K = J/T, at h = 0",
        "quantity": "specific_heat",
        "point": _POINT,
        "value": "0.3543460324503562527039302227057657",
        "rtol": 1e-12,
        "source": _JOYCE,
    },
    {
        "id": "correlation_length_of_the_spins",
        "statement": "xi = 1/ln(I0(J/T)/I1(J/T)) at h = 0",
        "quantity": "correlation_length(mx)",
        "point": _POINT,
        "value": "1.2398297601689272857168927662133",
        "rtol": 1e-12,
        "source": _JOYCE,
    },
    {
        "id": "correlation_length_of_the_axes",
        "statement": "correlations of cos 2a decay as (I2(J/T)/I0(J/T))^r at h = 0",
        "quantity": "correlation_length(q)",
        "point": _POINT,
        "value": "0.44785373710038370961743343288664",
        "rtol": 1e-12,
        "source": _JOYCE,
    },
    {
        "id": "free_energy_in_field",
        "statement": "f = -T ln l0, l0 the largest eigenvalue of the kernel at K = 1, h/T = 0.7",
        "quantity": "free_energy",
        "point": {"J": 1, "h": "0.7", "T": 1},
        "value": "-2.330350072963529305488674593172572",
        "rtol": 1e-13,
        "source": "the same with 40 and with 60 equal steps to 34 digits, in a program of its own",
    },
)
