"""Names of quantities, as a scan or the command line reads them, and what they stand for."""

from __future__ import annotations

import re
from dataclasses import dataclass

from ..declare import Chain
from ..errors import ParameterError, did_you_mean, listing
from .series import Series

__all__ = ["DIFFERENTIABLE", "QUANTITIES", "Quantity", "parse_quantity", "series_of"]

#: name -> (fewest, most) observables in brackets.
QUANTITIES = {
    "free_energy": (0, 0),
    "internal_energy": (0, 0),
    "entropy": (0, 0),
    "specific_heat": (0, 0),
    "mean": (1, 1),
    "susceptibility": (1, 2),
    "temperature_susceptibility": (1, 2),
    "correlation_length": (0, 1),
    "log_correlation_length": (0, 1),
    "wave_number": (0, 1),
    "gap": (0, 0),
}

#: Quantities that are derivatives of the free energy.
DIFFERENTIABLE = tuple(QUANTITIES)[:7]

_SHAPE = re.compile(r"^\s*([A-Za-z_]\w*)\s*(?:\((.*)\))?\s*$")


@dataclass(frozen=True)
class Quantity:
    """A quantity with its observables.

    Attributes
    ----------
    name : str
        One of `QUANTITIES`.
    observables : tuple of str
    """

    name: str
    observables: tuple[str, ...] = ()

    def __str__(self) -> str:
        return f"{self.name}({','.join(self.observables)})" if self.observables else self.name


def parse_quantity(text: str, chain: Chain) -> Quantity:
    """Read a quantity such as ``"susceptibility(m,q)"``.

    Raises
    ------
    ParameterError
        Unknown quantity or observable, or the wrong number of observables.

    Examples
    --------
    >>> from tmsolve.declare import Chain, ising, site
    >>> chain = Chain(ising(), [site(lambda s, h: -h*s)], observables={"m": lambda s: s})
    >>> str(parse_quantity("mean( m )", chain))
    'mean(m)'
    """
    match = _SHAPE.match(text) if isinstance(text, str) else None
    if match is None:
        raise ParameterError(
            f"a quantity is written name or name(observable), got {text!r}; known are {listing(QUANTITIES)}"
        )
    name, inside = match.group(1), match.group(2)
    if name not in QUANTITIES:
        raise ParameterError(f"no quantity {name!r}; known are {listing(QUANTITIES)}.{did_you_mean(name, QUANTITIES)}")
    observables = tuple(part.strip() for part in inside.split(",")) if inside and inside.strip() else ()
    fewest, most = QUANTITIES[name]
    if not fewest <= len(observables) <= most:
        wanted = f"{fewest}" if fewest == most else f"{fewest} to {most}"
        raise ParameterError(
            f"{name} takes {wanted} observable{'s' * (most != 1)} in brackets, got {len(observables)}; "
            f"this chain has {listing(chain.observables)}"
        )
    for observable in observables:
        chain.observable(observable)
    return Quantity(name, observables)


def series_of(quantity: Quantity, chain: Chain) -> Series:
    """Return a differentiable quantity as a sum of cumulants."""
    free = Series.free_energy(chain)
    if quantity.name == "free_energy":
        return free
    if quantity.name in ("mean", "susceptibility", "temperature_susceptibility"):
        names = (
            quantity.observables * 2
            if quantity.name != "mean" and len(quantity.observables) == 1
            else quantity.observables
        )
        return Series.of_observables(chain, names, 1 if quantity.name == "susceptibility" else 0)
    entropy = free.derive("T").times(-1)
    if quantity.name == "entropy":
        return entropy
    energy = free + entropy.times(1, -1)
    return energy if quantity.name == "internal_energy" else energy.derive("T")
