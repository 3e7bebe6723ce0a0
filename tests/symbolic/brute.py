"""Counting by enumeration in rational arithmetic, written without any of the package's machinery."""

from __future__ import annotations

import itertools
import math
from collections import Counter
from fractions import Fraction


def configurations(chain, cells):
    """Yield every configuration as a mapping from (kind, cell) to state, with its weight."""
    sites = [(kind, cell) for cell in range(cells) for kind in chain.cell]
    choices = [list(zip(chain.cell[kind].values, chain.cell[kind].weights, strict=True)) for kind, _ in sites]
    for chosen in itertools.product(*choices):
        weight = math.prod((Fraction(w) for _, w in chosen), start=Fraction(1))
        yield {site: state for site, (state, _) in zip(sites, chosen, strict=True)}, weight


def copies(term, states, cells, ring):
    """Yield the states that the copies of a term see."""
    low = min(shift for _, shift in term.places)
    for anchor in range(cells) if ring else range(-low, cells):
        places = [(kind, anchor + shift) for kind, shift in term.places]
        if ring:
            places = [(kind, cell % cells) for kind, cell in places]
        if all(place in states for place in places):
            yield [states[place] for place in places]


def total(term, states, cells, ring, values):
    """Add a term over its copies."""
    arguments = {name: values[name] for name in term.parameters}
    return sum(exact(term.function(*seen, **arguments)) for seen in copies(term, states, cells, ring))


def exact(value):
    """Return a value as a Fraction, or infinity."""
    if isinstance(value, float):
        return value if math.isinf(value) else Fraction(repr(value))
    return Fraction(value)


def enumerate_counts(chain, cells, ring, values, names):
    """Count configurations by tuples of energy and observables."""
    table = Counter()
    energies = [t for t in chain.terms if t.role == "energy"]
    weights = [t for t in chain.terms if t.role == "weight"]
    for states, weight in configurations(chain, cells):
        energy = sum((total(t, states, cells, ring, values) for t in energies), Fraction(0))
        for t in weights:
            arguments = {name: values[name] for name in t.parameters}
            for seen in copies(t, states, cells, ring):
                weight *= exact(t.function(*seen, **arguments))
        if energy == math.inf or not weight:
            continue
        key = []
        for name in names:
            if name == "energy":
                key.append(energy)
            else:
                terms = chain.observables[name]
                key.append(sum((total(t, states, cells, ring, values) for t in terms), Fraction(0)))
        table[tuple(key)] += weight
    return dict(table)
