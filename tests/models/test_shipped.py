"""The shipped models: complete, sourced, and with the Hamiltonians their documentation states."""

import ast
import re
from fractions import Fraction
from itertools import islice, product
from math import cos, sin

import pytest

from tmsolve import cos_turns, models
from tmsolve.models._names import shipped

PARAMETERS = {
    "ising": ("J", "h"),
    "potts": ("J", "h"),
    "clock": ("J", "h"),
    "blume_capel": ("J", "D", "h"),
    "blume_emery_griffiths": ("J", "K", "K3", "D", "h"),
    "ising_nnn": ("J1", "J2", "h"),
    "spin1_nnn": ("J1", "J2", "D", "h"),
    "mixed_spin": ("J", "D", "h"),
    "diamond": ("J1", "J2", "h"),
    "ladder": ("J", "R", "h"),
    "lattice_gas": ("mu",),
    "helix_coil": ("s", "sigma"),
    "random_field_ising": ("J", "H", "h"),
    "random_bond_ising": ("J", "h"),
    "diluted_blume_capel": ("J", "D", "h", "c"),
    "xy": ("J", "h"),
    "heisenberg": ("J", "h", "D"),
    "harmonic": ("k", "g", "p", "f"),
    "phi4": ("C", "a", "b", "h"),
}
# Few nodes, so that all configurations of a ring can be gone through.
FEW = {
    "potts": {"q": 3}, "clock": {"q": 3}, "xy": {"nodes": 4}, "heisenberg": {"degree": 1}, "harmonic": {"nodes": 4},
    "phi4": {"nodes": 4},
}  # fmt: skip
CONTINUOUS = {"xy", "heisenberg", "harmonic", "phi4"}
MODELS = pytest.mark.parametrize("name", models.names())
FACT_KEYS = {"id", "statement", "quantity", "point", "value", "rtol", "source"}
MORE_FACT_KEYS = {"options", "cells", "boundary", "left", "right", "derivative", "atol"}


def test_every_model_of_the_list_ships():
    assert set(models.names()) == PARAMETERS.keys()


@MODELS
def test_parameters_are_the_documented_ones(name):
    assert models.load(name).chain.parameters == PARAMETERS[name]


@MODELS
def test_the_docstring_gives_a_formula_and_a_use(name):
    paragraphs = models.load(name).doc.split("\n\n")
    assert len(paragraphs) == 3
    assert re.match(r"E = sum_i \[ .* \],\s|weight of a configuration = ", paragraphs[1].replace("\n", " "))
    assert len(paragraphs[2]) > 40


@MODELS
def test_defaults_are_exact_and_complete(name):
    model = models.load(name)
    assert model.defaults.keys() == {*model.chain.parameters, "T"}
    for value in model.defaults.values():
        assert type(value) in (int, str)
        assert isinstance(Fraction(value), Fraction)
    assert model.chain.at(**model.defaults).shape == ()


@MODELS
def test_facts_are_complete_and_sourced(name):
    facts = models.load(name).facts
    assert len(facts) >= 4
    assert len({fact["id"] for fact in facts}) == len(facts)
    for fact in facts:
        assert FACT_KEYS <= fact.keys() <= FACT_KEYS | MORE_FACT_KEYS
        assert ("cells" in fact) == ("boundary" in fact)
        assert fact["statement"] and fact["source"]
        assert fact["rtol"] <= 1e-9
        # 0, 1/4 and 1/2 are exact; everything else is given to more digits than double precision holds.
        assert fact["value"] in ("0", "0.25", "0.5") or len(re.sub(r"\D", "", fact["value"]).lstrip("0")) >= 30


@MODELS
def test_a_model_file_needs_nothing_but_tmsolve(name):
    tree = ast.parse(shipped()[name].read_text(encoding="utf-8"))
    imported = {node.module for node in ast.walk(tree) if isinstance(node, ast.ImportFrom)}
    assert not any(isinstance(node, ast.Import) for node in ast.walk(tree))
    assert "tmsolve" in imported and imported <= {"tmsolve", "math"}


def test_models_can_be_imported_as_modules():
    from tmsolve.models import ising, potts

    assert ising.CHAIN.parameters == ("J", "h")
    assert len(potts.chain(q=7).cell["s"]) == 7


@pytest.mark.parametrize("name", ["potts", "clock"])
def test_the_option_q_is_the_number_of_states(name):
    for q in (2, 3, 5):
        model = models.load(name, q=q)
        assert model.options == {"q": q}
        assert len(model.chain.cell["s"]) == q


# --- the Hamiltonians, written once more by hand on a ring of five cells

VALUES = {
    "J": Fraction(3, 7), "J1": Fraction(5, 11), "J2": Fraction(-2, 13), "K": Fraction(7, 17),
    "K3": Fraction(-3, 19), "D": Fraction(4, 23), "R": Fraction(-6, 29),
    "H": Fraction(-5, 41), "c": Fraction(3, 5),
    "h": Fraction(9, 31), "mu": Fraction(8, 37), "k": Fraction(5, 7), "g": Fraction(2, 11), "p": Fraction(3, 13),
    "f": Fraction(-7, 17), "C": Fraction(6, 19), "a": Fraction(-8, 23), "b": Fraction(9, 29),
}  # fmt: skip
RING = 5


def neighbours(sites, shift=1):
    return [(sites[i], sites[(i + shift) % len(sites)]) for i in range(len(sites))]


def ising(c, J, h):
    return -J * sum(s * t for s, t in neighbours(c["s"])) - h * sum(c["s"])


def random_field_ising(c, J, H, h):
    return ising(c, J, H + h)


def random_bond_ising(c, J, h):
    return ising(c, J, h)


def potts(c, J, h):
    return -J * sum(s == t for s, t in neighbours(c["s"])) - h * c["s"].count(0)


def clock(c, J, h):
    # Three directions, where every cosine is 1 or -1/2.
    cosine = {0: Fraction(1), 1: Fraction(-1, 2), 2: Fraction(-1, 2)}
    return -J * sum(cosine[(n - k) % 3] for n, k in neighbours(c["s"])) - h * sum(cosine[n] for n in c["s"])


def blume_capel(c, J, D, h):
    return ising(c, J, h) + D * sum(s * s for s in c["s"])


def blume_emery_griffiths(c, J, K, K3, D, h):
    pairs = neighbours(c["s"])
    quartic = sum(s * s * t * t for s, t in pairs)
    odd = sum(s * s * t + s * t * t for s, t in pairs)
    return blume_capel(c, J, D, h) - K * quartic - K3 * odd


def ising_nnn(c, J1, J2, h):
    return ising(c, J1, h) - J2 * sum(s * t for s, t in neighbours(c["s"], 2))


def spin1_nnn(c, J1, J2, D, h):
    return ising_nnn(c, J1, J2, h) + D * sum(s * s for s in c["s"])


def mixed_spin(c, J, D, h):
    small, large = c["s"], c["S"]
    bonds = sum(small[i] * large[i] + large[i] * small[(i + 1) % RING] for i in range(RING))
    return -J * bonds + D * sum(S * S for S in large) - h * (sum(small) + sum(large))


def diamond(c, J1, J2, h):
    n, a, b = c["n"], c["a"], c["b"]
    sides = sum((n[i] + n[(i + 1) % RING]) * (a[i] + b[i]) for i in range(RING))
    return -J1 * sides - J2 * sum(x * y for x, y in zip(a, b, strict=True)) - h * (sum(n) + sum(a) + sum(b))


def ladder(c, J, R, h):
    legs = sum(s * t for leg in "ab" for s, t in neighbours(c[leg]))
    return (
        -J * legs
        - R * sum(x * y for x, y in zip(c["a"], c["b"], strict=True))
        - h * (sum(c["a"]) + sum(c["b"]))
    )


def lattice_gas(c, mu):
    return float("inf") if any(n and k for n, k in neighbours(c["s"])) else -mu * sum(c["s"])


def xy(c, J, h):
    return -J * sum(cos(s) * cos(t) + sin(s) * sin(t) for s, t in neighbours(c["s"])) - h * sum(map(cos, c["s"]))


def heisenberg(c, J, h, D):
    products = sum(x * y for s, t in neighbours(c["s"]) for x, y in zip(s, t, strict=True))
    return -J * products - sum(h * z + D * z**2 for _, _, z in c["s"])


def harmonic(c, k, g, p, f):
    stretched = [x - y for x, y in neighbours(c["s"])]
    return sum(k / 2 * d**2 + g / 4 * d**4 for d in stretched) + sum(p / 2 * x**2 - f * x for x in c["s"])


def phi4(c, C, a, b, h):
    wells = sum(a / 2 * u**2 + b / 4 * u**4 - h * u for u in c["s"])
    return C / 2 * sum((u - v) ** 2 for u, v in neighbours(c["s"])) + wells


def total(chain, configuration, role, values):
    """Sum of the declared terms of one role over a ring; for weights the list of factors."""
    parts = []
    for term in chain.terms:
        if term.role == role:
            for cell in range(RING):
                states = [configuration[kind][(cell + shift) % RING] for kind, shift in term.places]
                parts.append(term.function(*states, **{name: values[name] for name in term.parameters}))
    return parts if role == "weight" else sum(parts)


def configurations(chain, count=400):
    """A spread of ring configurations, all of them where there are few."""
    kinds = list(chain.cell)
    places = [chain.cell[kind].values for kind in kinds for _ in range(RING)]
    size = 1
    for states in places:
        size *= len(states)
    for states in islice(product(*places), 0, None, max(1, size // count)):
        yield {kind: list(states[RING * k : RING * (k + 1)]) for k, kind in enumerate(kinds)}


@pytest.mark.parametrize("name", sorted(PARAMETERS.keys() - {"helix_coil", "diluted_blume_capel"}))
def test_the_energy_is_the_documented_one(name):
    model = models.load(name, **FEW.get(name, {}))
    values = {parameter: VALUES[parameter] for parameter in model.chain.parameters}
    seen = set()
    for configuration in configurations(model.chain):
        energy = total(model.chain, configuration, "energy", values)
        expected = globals()[name](configuration, **values)
        assert energy == expected or (CONTINUOUS & {name} and energy == pytest.approx(expected, rel=1e-12, abs=1e-12))
        seen.add(energy)
    assert len(seen) > 2
    assert not any(term.role == "weight" for term in model.chain.terms)


def test_the_weight_of_a_helical_run_of_length_k_is_sigma_s_to_the_k():
    chain = models.load("helix_coil").chain
    values = {"s": Fraction(11, 10), "sigma": Fraction(1, 100)}
    for configuration in configurations(chain):
        units = configuration["s"]
        runs = [(left, unit) for left, unit in neighbours(units)].count(("coil", "helix"))
        expected = values["sigma"] ** runs * values["s"] ** units.count("helix")
        product_of_factors = Fraction(1)
        for factor in total(chain, configuration, "weight", values):
            product_of_factors *= factor
        assert product_of_factors == expected


def test_a_diluted_chain_weighs_every_spin_that_is_not_zero():
    chain = models.load("diluted_blume_capel").chain
    values = {parameter: VALUES[parameter] for parameter in chain.parameters}
    for configuration in configurations(chain):
        spins_there = [s for s in configuration["s"] if s]
        product_of_factors = Fraction(1)
        for factor in total(chain, configuration, "weight", values):
            product_of_factors *= factor
        assert product_of_factors == values["c"] ** len(spins_there)
        others = {name: value for name, value in values.items() if name != "c"}
        assert total(chain, configuration, "energy", values) == blume_capel(configuration, **others)


OBSERVABLES = {
    "random_field_ising": {"m": lambda s: s},
    "random_bond_ising": {"m": lambda s: s},
    "diluted_blume_capel": {"m": lambda s: s, "q": lambda s: s * s},
    "ising": {"m": lambda s: s},
    "potts": {"m": lambda s: int(s == 0)},
    "clock": {"m": lambda s: cos_turns(s, 6)},
    "blume_capel": {"m": lambda s: s, "q": lambda s: s * s},
    "blume_emery_griffiths": {"m": lambda s: s, "q": lambda s: s * s},
    "ising_nnn": {"m": lambda s: s},
    "spin1_nnn": {"m": lambda s: s, "q": lambda s: s * s},
    "mixed_spin": {
        "m": lambda s, S: s + S, "m_s": lambda s, S: s, "m_S": lambda s, S: S, "q": lambda s, S: S * S,
    },
    "diamond": {
        "m": lambda n, a, b: n + a + b, "m_node": lambda n, a, b: n, "m_dimer": lambda n, a, b: a + b,
    },
    "ladder": {"m": lambda a, b: a + b, "rung": lambda a, b: a * b},
    "lattice_gas": {"density": lambda n: n},
    "helix_coil": {"helicity": lambda s: int(s == "helix")},
    "xy": {"mx": cos, "my": sin, "q": lambda a: cos(2*a)},
    "heisenberg": {
        "mx": lambda s: s[0], "my": lambda s: s[1], "mz": lambda s: s[2], "q": lambda s: (3*s[2]*s[2] - 1) / 2,
    },
    "harmonic": {"x": lambda x: x, "x2": lambda x: x*x},
    "phi4": {"u": lambda u: u, "u2": lambda u: u*u},
}  # fmt: skip


@MODELS
def test_observables_are_the_documented_ones(name):
    chain = models.load(name).chain
    assert list(chain.observables) == list(OBSERVABLES[name])
    for states in product(*(kind.values for kind in chain.cell.values())):
        at = dict(zip(chain.cell, states, strict=True))
        for observable, parts in chain.observables.items():
            value = sum(part.function(*(at[kind] for kind, _ in part.places)) for part in parts)
            assert value == OBSERVABLES[name][observable](*states)
