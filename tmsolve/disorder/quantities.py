"""Names of averages over disorder, as the command line reads them."""

from __future__ import annotations

import re
from collections.abc import Mapping
from typing import Any

from ..declare import Chain
from ..errors import NotApplicable, ParameterError, did_you_mean, listing
from .averages import Average

__all__ = ["average_named", "average_names", "evaluate", "ground_named", "ground_names"]

#: name -> (fewest, most) arguments in brackets.
_NAMES = {
    "free_energy": (0, 0),
    "internal_energy": (0, 0),
    "entropy": (0, 0),
    "specific_heat": (0, 0),
    "mean": (1, 1),
    "susceptibility": (1, 2),
    "derivative": (1, 2),
    "probability_derivative": (2, 3),
    "correlation_length": (0, 0),
    "average_correlation_length": (0, 0),
    "correlation": (3, 3),
    "glass_susceptibility": (1, 1),
    "lyapunov": (1, 1),
}
#: The same at T = 0.
_AT_ZERO = {
    "energy": (0, 0),
    "residual_entropy": (0, 0),
    "mean": (1, 1),
    "overlap": (1, 1),
    "walls": (1, 1),
    "mean_length": (1, 1),
    "domains": (1, 1),
}
_SHAPE = re.compile(r"^\s*([A-Za-z_]\w*)\s*(?:\((.*)\))?\s*$")


def average_names(chain: Chain, random: Any) -> list[str]:
    """Return what is read when nothing is asked for: thermodynamics and the observables free of random parameters."""
    kept = [n for n, parts in chain.observables.items() if not any(p in random for t in parts for p in t.parameters)]
    names = ["free_energy", "internal_energy", "entropy", "specific_heat"]
    return [*names, *(f"{kind}({name})" for name in kept for kind in ("mean", "susceptibility")), "correlation_length"]


def average_named(text: str) -> tuple[str, tuple[Any, ...]]:
    """Split a name such as ``"susceptibility(m,q)"`` into method and arguments.

    Examples
    --------
    >>> average_named("lyapunov(2)"), average_named("mean( m )")
    (('lyapunov', (2,)), ('mean', ('m',)))
    """
    name, arguments = _split(text, _NAMES, "average")
    if name == "lyapunov":
        if not arguments[0].isdecimal():
            raise ParameterError(f"lyapunov(k) takes a whole number k >= 1, got {text!r}")
        arguments = (int(arguments[0]),)
    if name == "correlation":
        if not arguments[2].isdecimal():
            raise ParameterError(f"correlation(a,b,r) takes two observables and a whole number of cells, got {text!r}")
        arguments = (*arguments[:2], int(arguments[2]))
    return name, arguments


def ground_names(chain: Chain, random: Any) -> list[str]:
    """Return what is read at T = 0 when nothing is asked for; domains where an observable is that of one site."""
    kept = {n: p for n, p in chain.observables.items() if not any(q in random for t in p for q in t.parameters)}
    single = [name for name, parts in kept.items() if len(parts) == len(parts[0].sites) == 1]
    return ["energy", "residual_entropy", *(f"mean({name})" for name in kept), *(f"domains({name})" for name in single)]


def ground_named(text: str) -> tuple[str, tuple[Any, ...]]:
    """Split a name such as ``"walls(m)"``, as it is read at T = 0, into what and of which observable.

    Examples
    --------
    >>> ground_named("walls(m)"), ground_named("energy")
    (('walls', ('m',)), ('energy', ()))
    """
    return _split(text, _AT_ZERO, "average at T = 0")


def _split(text: str, names: Mapping[str, tuple[int, int]], what: str) -> tuple[str, tuple[Any, ...]]:
    match = _SHAPE.match(text)
    if match is None or match.group(1) not in names:
        name = match.group(1) if match else text
        raise ParameterError(f"no {what} {name!r}; there are {listing(names)}.{did_you_mean(name, names)}")
    name, inside = match.group(1), match.group(2) or ""
    arguments = tuple(part.strip() for part in inside.split(",")) if inside.strip() else ()
    fewest, most = names[name]
    if not fewest <= len(arguments) <= most:
        wanted = f"{fewest}" if fewest == most else f"{fewest} to {most}"
        raise ParameterError(f"{name} takes {wanted} names in brackets, got {text!r}")
    return name, arguments


def evaluate(averages: Any, name: str, arguments: tuple[Any, ...]) -> Average:
    """Read one average of a result, or a number that has no error."""
    if not hasattr(averages, name):
        raise NotApplicable(f"{name} is not known of this kind of average")
    found = getattr(averages, name)
    value = found(*arguments) if callable(found) else found
    return value if isinstance(value, Average) else Average(float(value), 0.0)
