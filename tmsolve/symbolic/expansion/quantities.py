"""Which expansion a quantity needs, and how it follows from that of ln λ."""

from __future__ import annotations

import re
from collections.abc import Callable
from dataclasses import dataclass
from typing import Any

from ...declare.chain import Chain
from ...errors import ParameterError, did_you_mean
from .matrix import Part
from .terms import LogSeries, SeriesTerm, by_beta, collected, scaled

__all__ = ["Quantity", "parse_quantity"]

_SHAPE = re.compile(r"^\s*([A-Za-z_]\w*)\s*(?:\((.*)\)\s*)?$")


@dataclass(frozen=True)
class Quantity:
    """One quantity as asked for.

    Attributes
    ----------
    name : str
        Canonical text such as ``"mean(m)"``.
    symbol, latex : str
        As text and as LaTeX.
    observables : tuple of str
        Whose sources it needs.
    lift : int
        Powers of β in ln λ, or its derivative by the sources, beyond those of the quantity.
    terms : callable
        From the expansion of ln λ to the terms of the quantity.
    """

    name: str
    symbol: str
    latex: str
    observables: tuple[str, ...]
    lift: int
    terms: Callable[[LogSeries], list[SeriesTerm]]


def _free_energy(log: LogSeries) -> list[SeriesTerm]:
    return scaled(log.log_eigenvalue(), -1, -1)


def _internal_energy(log: LogSeries) -> list[SeriesTerm]:
    return scaled(by_beta(log.log_eigenvalue()), -1, 0)


def _entropy(log: LogSeries) -> list[SeriesTerm]:
    whole = log.log_eigenvalue()
    return collected([*whole, *scaled(by_beta(whole), -1, 1)])


def _specific_heat(log: LogSeries) -> list[SeriesTerm]:
    return scaled(by_beta(by_beta(log.log_eigenvalue())), 1, 2)


def _source(part: Part, power: int) -> Callable[[LogSeries], list[SeriesTerm]]:
    return lambda log: scaled(collected(log.parts[part]), 1, power)


_PLAIN: dict[str, tuple[str, str, int, Callable[[LogSeries], list[SeriesTerm]]]] = {
    "free_energy": ("f", "f", 1, _free_energy),
    "internal_energy": ("u", "u", 1, _internal_energy),
    "entropy": ("s", "s", 0, _entropy),
    "specific_heat": ("c", "c", 0, _specific_heat),
    "log_eigenvalue": ("ln(lambda)", r"\ln \lambda", 0, lambda log: log.log_eigenvalue()),
}
_NAMES = [*_PLAIN, "mean(a)", "susceptibility(a)", "susceptibility(a,b)"]


def parse_quantity(text: Any, chain: Chain) -> Quantity:
    """Read the name of a quantity, such as ``mean(m)``.

    Raises
    ------
    ParameterError
        Unknown name or observable, or brackets where there should be none.

    Examples
    --------
    >>> from tmsolve.declare import bond, ising
    >>> chain = Chain(ising(), [bond(lambda s, t, J: -J*s*t)], {"m": lambda s: s})
    >>> parse_quantity("susceptibility( m )", chain).name
    'susceptibility(m)'
    """
    match = _SHAPE.match(text) if isinstance(text, str) else None
    kind, inside = (match.group(1), match.group(2)) if match else ("", None)
    names = [part.strip() for part in inside.split(",")] if inside is not None else []
    if kind in _PLAIN and inside is None:
        symbol, latex, lift, terms = _PLAIN[kind]
        return Quantity(kind, symbol, latex, (), lift, terms)
    count = {"mean": (1,), "susceptibility": (1, 2)}.get(kind, ())
    if len(names) not in count or not all(names):
        raise ParameterError(
            f"of= names a quantity with a series: {', '.join(_NAMES)}; got {text!r}.{did_you_mean(str(text), _NAMES)}"
        )
    for name in names:
        chain.observable(name)
    shown = ",".join(names)
    if kind == "mean":
        return Quantity(f"mean({shown})", f"<{shown}>", rf"\langle {shown} \rangle", (shown,), 0, _source((1, 0), 0))
    pair = (names[0], names[-1])
    return Quantity(f"susceptibility({shown})", f"chi_{shown}", rf"\chi_{{{shown}}}", pair, -1, _source((1, 1), 1))
