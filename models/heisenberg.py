"""Classical Heisenberg chain: spins are unit vectors.

E = sum_i [ -J S_i . S_{i+1} - D (S_i^z)^2 - h S_i^z ],  |S| = 1

Isotropic magnets with chain structure and large spin; D > 0 makes z an easy axis, D < 0 an easy plane.
The vectors are the nodes of a rule that integrates polynomials up to a degree exactly; at low temperature a
higher one is needed, about 12 (J/T)^(1/2).
"""

from tmsolve import Chain, bond, site, sphere


def chain(degree: int = 16, rule: str = "product") -> Chain:
    """Declare the chain with the vectors of a rule of this degree."""
    return Chain(
        sphere(degree, rule),
        [
            bond(lambda s, t, J: -J*(s[0]*t[0] + s[1]*t[1] + s[2]*t[2])),
            site(lambda s, h: -h*s[2]),
            site(lambda s, D: -D*s[2]*s[2]),
        ],
        observables={
            "mx": lambda s: s[0], "my": lambda s: s[1], "mz": lambda s: s[2], "q": lambda s: (3*s[2]*s[2] - 1)/2,
        },
        name="Heisenberg chain",
    )  # fmt: skip


DEFAULTS = {"J": 1, "h": 0, "D": 0, "T": 1}

_FISHER = "M. E. Fisher, Am. J. Phys. 32, 343 (1964); from memory"
_POINT = {"J": 1, "h": 0, "D": 0, "T": 1}

FACTS = (
    {
        "id": "free_energy_without_field",
        "statement": "f = -T ln(4 pi sinh(K)/K), K = J/T, at h = 0",
        "quantity": "free_energy",
        "point": _POINT,
        "value": "-2.692463608540486426588011322711761",
        "rtol": 1e-13,
        "source": _FISHER,
    },
    {
        "id": "internal_energy_without_field",
        "statement": "u = -J (coth K - 1/K), K = J/T, at h = 0",
        "quantity": "internal_energy",
        "point": _POINT,
        "value": "-0.3130352854993313036361612469308478",
        "rtol": 1e-12,
        "source": _FISHER,
    },
    {
        "id": "internal_energy_of_three_components",
        "statement": "u = -J I_{n/2}(K)/I_{n/2-1}(K), n = 3, K = J/T",
        "quantity": "internal_energy",
        "point": {**_POINT, "J": "1.5"},
        "value": "-0.6571870894737678559159981837992652",
        "rtol": 1e-12,
        "source": "H. E. Stanley, Phys. Rev. 179, 570 (1969); from memory",
    },
    {
        "id": "specific_heat_without_field",
        "statement": "c = 1 - (K/sinh K)^2, K = J/T, at h = 0",
        "quantity": "specific_heat",
        "point": _POINT,
        "value": "0.2759383390336895335920112108694094",
        "rtol": 1e-12,
        "source": _FISHER,
    },
    {
        "id": "curie_product_along_z",
        "statement": "T chi = (1 + L)/(3(1 - L)), L = coth K - 1/K, K = J/T, at h = 0",
        "quantity": "temperature_susceptibility(mz)",
        "point": _POINT,
        "value": "0.63711922790373691296923630606841",
        "rtol": 1e-12,
        "source": _FISHER,
    },
    {
        "id": "curie_product_across",
        "statement": "the same along x: no direction is distinguished at h = 0",
        "quantity": "temperature_susceptibility(mx)",
        "point": _POINT,
        "value": "0.63711922790373691296923630606841",
        "rtol": 1e-12,
        "source": _FISHER,
    },
    {
        "id": "correlation_length_of_the_spins",
        "statement": "xi = -1/ln(coth K - 1/K), K = J/T, at h = 0",
        "quantity": "correlation_length(mz)",
        "point": _POINT,
        "value": "0.86100061104111332975365816243378",
        "rtol": 1e-12,
        "source": _FISHER,
    },
)
