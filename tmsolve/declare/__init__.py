"""What the user writes: states, terms, observables, chains and points. It computes nothing."""

from .chain import Chain
from .grids import circle, interval, line, sphere
from .palettes import colours
from .point import Point
from .states import StateSet, clock, ising, occupation, spins
from .terms import Term, bond, cos_turns, delta, site, term, weight

__all__ = [
    "Chain",
    "Point",
    "StateSet",
    "Term",
    "bond",
    "circle",
    "clock",
    "colours",
    "cos_turns",
    "delta",
    "interval",
    "ising",
    "line",
    "occupation",
    "site",
    "sphere",
    "spins",
    "term",
    "weight",
]
