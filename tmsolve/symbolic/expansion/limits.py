"""The two ends of the temperature axis: limits of all quantities, with their leading corrections."""

from __future__ import annotations

from collections.abc import Mapping
from dataclasses import dataclass
from types import MappingProxyType
from typing import Any

from ...declare.chain import Chain
from ...errors import DeclarationError, NotApplicable
from ..closed import ClosedForm
from ..plain import plain_text
from .result import Series
from .series import series

__all__ = ["Limits", "limits"]

#: At high temperature the power of β with the leading correction: it is the variance of the energy, or linear in β.
_HIGH = {"free_energy": 1, "internal_energy": 1, "entropy": 2, "specific_heat": 2}
_HIGH_MEAN, _HIGH_SUSCEPTIBILITY = 1, 2
#: Orders beyond the usual ones in which a correction is looked for; of a mean that vanishes by symmetry there is none.
_FURTHER = 4


@dataclass(frozen=True, eq=False, repr=False)
class Limits:
    """What a chain does at infinite temperature and near T = 0.

    Made by `limits`.

    Attributes
    ----------
    chain : Chain
        What was looked at.
    high, low : mapping of str to Series
        By name of the quantity: its limit and leading corrections. At low temperature these
        are all terms up to exp(−Δ/T), Δ the least excitation energy, or up to the first power
        of that with a correction.
    why : str
        Why there is nothing at low temperature; empty where there is.

    Examples
    --------
    >>> from tmsolve.declare import bond, ising, site
    >>> chain = Chain(ising(), [bond(lambda s, t, J: -J*s*t), site(lambda s, h: -h*s)], {"m": lambda s: s})
    >>> found = limits(chain.fix(J=-1, h=2))
    >>> found.residual_entropy, found.residual_polynomial.as_expr(), found.gap
    (log(1/2 + sqrt(5)/2), x**2 - x - 1, 4)
    >>> limits(chain).high["specific_heat"].expression
    beta**2*(J**2 + h**2)
    """

    chain: Chain
    high: Mapping[str, Series]
    low: Mapping[str, Series]
    why: str

    def _ground(self) -> Series:
        if not self.low:
            raise NotApplicable(f"nothing is known at low temperature: {self.why}")
        return self.low["free_energy"]

    @property
    def residual_entropy(self) -> Any:
        """Entropy per cell at T → 0, as ln of the growth factor of the ground states."""
        import sympy as sp

        return sp.log(self._ground().growth)

    @property
    def residual_polynomial(self) -> Any:
        """Minimal polynomial, a ``sympy.Poly`` in x, whose largest real root is exp(residual entropy)."""
        return self._ground().polynomial

    @property
    def ground_energy(self) -> Any:
        """Energy per cell at T → 0."""
        return self._ground().ground

    @property
    def gap(self) -> Any:
        """Least excitation energy Δ in ln λ; None where every configuration is a ground state."""
        return self._ground().gap

    def __str__(self) -> str:
        lines = [f"limits of {self.chain.name}, beta = 1/T", "  T -> infinity"]
        lines += [f"    {_line(item)}" for item in self.high.values()]
        lines.append("  T -> 0")
        if not self.low:
            return "\n".join([*lines, f"    {self.why}"])
        lines += [f"    {_line(item)}" for item in self.low.values()]
        lines.append(f"    residual entropy {plain_text(self.residual_entropy)}, exp of it being the largest root of")
        return "\n".join([*lines, f"      {plain_text(self.residual_polynomial.as_expr())}"])

    def __repr__(self) -> str:
        return f"<Limits of {self.chain.name!r}: {len(self.high)} at high, {len(self.low)} at low temperature>"


def _line(item: Series) -> str:
    return str(item).split("\n")[1].strip()


def limits(chain: Chain | ClosedForm, *, time_limit: float = 30) -> Limits:
    """Return the limits of f, u, s, c and of means and susceptibilities, each with its leading correction.

    Parameters
    ----------
    chain : Chain or ClosedForm
        At low temperature numbers are needed for all parameters (``chain.fix``).
    time_limit : float
        Seconds for each series.

    Raises
    ------
    NotApplicable
        There is no series at either end.
    """
    declared = chain.chain if isinstance(chain, ClosedForm) else chain
    if not isinstance(declared, Chain):
        raise DeclarationError(f"limits takes a chain or a closed form, got {chain!r}")
    orders = dict(_HIGH)
    for name in declared.observables:
        orders[f"mean({name})"] = _HIGH_MEAN
        orders[f"susceptibility({name})"] = _HIGH_SUSCEPTIBILITY
    high, why_high = _collected(declared, orders, "high", time_limit)
    low, why_low = _collected(declared, dict.fromkeys(orders, 1), "low", time_limit)
    if not high and not low:
        raise NotApplicable(f"{why_high}; {why_low}" if why_high != why_low else why_high)
    return Limits(declared, MappingProxyType(high), MappingProxyType(low), why_low)


def _corrected(chain: Chain, order: int, about: str, name: str, time_limit: float) -> Series:
    """Return the series of the least order with a correction; that of ``order`` where there is none for long."""
    first = series(chain, order, about, name, time_limit=time_limit)
    found = first
    for further in range(order + 1, order + 1 + _FURTHER):
        if found.exact or any(term.energy != 0 if about == "low" else term.power > 0 for term in found.terms):
            return found
        found = series(chain, further, about, name, time_limit=time_limit)
    return first


def _collected(chain: Chain, orders: Mapping[str, int], about: str, time_limit: float) -> tuple[dict[str, Series], str]:
    """Return the series of all quantities that have one, and why others have none."""
    found, why = {}, ""
    for name, order in orders.items():
        try:
            found[name] = _corrected(chain, order, about, name, time_limit)
        except NotApplicable as error:
            why = why or str(error)
            if name == "free_energy":
                break
    return found, why
