"""Readings: quantities with their symbols and units, as tables and figures show them."""

from __future__ import annotations

from collections.abc import Callable
from dataclasses import dataclass
from typing import Any

import numpy as np

from ..declare import Chain
from ..errors import ParameterError
from .quantities import Quantity, parse_quantity
from .solution import Solution

__all__ = ["Reading", "parse_reading", "read_value"]

#: name -> (symbol, LaTeX, unit); {} holds the observables, per unit cell and k_B = 1.
_LOOKS = {
    "free_energy": ("f", "f", "energy"),
    "internal_energy": ("u", "u", "energy"),
    "entropy": ("s", "s", "k_B"),
    "specific_heat": ("c", "c", "k_B"),
    "mean": ("⟨{}⟩", r"\langle {} \rangle", "1"),
    "susceptibility": ("χ_{}", r"\chi_{{{}}}", "1/energy"),
    "temperature_susceptibility": ("T·χ_{}", r"T\chi_{{{}}}", "1"),
    "correlation_length": ("ξ", r"\xi", "cells"),
    "log_correlation_length": ("ln ξ", r"\ln\xi", "1"),
    "wave_number": ("k", "k", "1/cell"),
    "gap": ("ln λ₁/|λ₂|", r"\ln\lambda_1/|\lambda_2|", "1/cell"),
}


@dataclass(frozen=True)
class Reading:
    """One number per point, with what is needed to label it.

    Attributes
    ----------
    name : str
        Canonical text such as ``"susceptibility(m)"``; a column's heading.
    symbol, latex : str
        For axes, plain and as LaTeX without dollar signs.
    unit : str
        ``"energy"`` is the user's energy unit; quantities are per unit cell, k_B = 1.
    """

    name: str
    symbol: str
    latex: str
    unit: str
    function: Callable[[Solution], Any]

    def evaluate(self, solution: Solution) -> np.ndarray:
        """Return the value at every point, of the shape of the batch; long numbers where digits were asked for.

        Raises
        ------
        ParameterError
            A callable reading returned something else than one number per point.
        """
        value = np.asarray(self.function(solution))
        if value.dtype == object and value.shape == solution.shape and solution.laws.digits is not None:
            return value
        if value.shape != solution.shape or value.dtype.kind not in "biuf":
            raise ParameterError(
                f"reading {self.name!r} returned {value.dtype.name} of shape {value.shape}; "
                f"it must return one real number per point, shape {solution.shape}"
            )
        return value.astype(np.float64)


def parse_reading(reading: str | Callable[[Solution], Any], chain: Chain) -> Reading:
    """Turn a name or a callable of a `Solution` into a reading.

    Raises
    ------
    ParameterError
        Unknown name; the message names the nearest.

    Examples
    --------
    >>> from tmsolve.declare import Chain, ising, site
    >>> chain = Chain(ising(), [site(lambda s, h: -h*s)], observables={"m": lambda s: s})
    >>> reading = parse_reading("susceptibility(m)", chain)
    >>> reading.symbol, reading.unit
    ('χ_m', '1/energy')
    """
    if callable(reading):
        name = getattr(reading, "__name__", type(reading).__name__)
        return Reading(str(name), str(name), rf"\mathrm{{{name}}}".replace("_", r"\_"), "", reading)
    quantity = parse_quantity(reading, chain)
    symbol, latex, unit = _LOOKS[quantity.name]
    inside = ",".join(quantity.observables)
    upright = ",".join(_latex_name(name) for name in quantity.observables)
    # Subscripts name the observables; ξ and k carry one only where they were asked for one.
    if quantity.name in ("correlation_length", "log_correlation_length", "wave_number") and inside:
        symbol, latex = symbol + "_{}", latex + "_{{{}}}"
    return Reading(
        str(quantity),
        symbol.format(inside) if inside else symbol,
        latex.format(upright) if inside else latex,
        unit,
        lambda solution: read_value(solution, quantity),
    )


def _latex_name(name: str) -> str:
    """Write a name for LaTeX: single letters in italics, words upright with underscores kept."""
    if len(name) == 1:
        return name
    return rf"\mathrm{{{name}}}".replace("_", r"\_")


def read_value(solution: Solution, quantity: Quantity) -> np.ndarray:
    """Return a quantity of a solution."""
    if quantity.name == "gap":
        return solution.gaps(1)[..., 0]
    member = getattr(solution, quantity.name)
    return np.asarray(member(*quantity.observables) if callable(member) else member)
