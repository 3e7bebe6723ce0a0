"""What continuous states cannot answer: they are nodes of a quadrature rule, known to double precision."""

from __future__ import annotations

from collections.abc import Mapping
from fractions import Fraction

from ..errors import NotApplicable
from .states import StateSet
from .values import Value

__all__ = ["NodeWeight", "require_discrete", "require_warm"]


class NodeWeight(float):
    """Weight of a quadrature node: a float that refuses to be taken for an exact fraction.

    Exact questions turn the weights of states into fractions, and so none of them mistakes
    the nodes for the states that the user meant.
    """

    __slots__ = ()

    def as_integer_ratio(self) -> tuple[int, int]:
        """Refuse, as every exact conversion comes here.

        Raises
        ------
        NotApplicable
            Always.
        """
        raise _inexact("This question", "the states")


def require_discrete(cell: Mapping[str, StateSet], what: str) -> None:
    """Refuse an exact question where states are nodes of a quadrature rule.

    Raises
    ------
    NotApplicable
        Some kind of site has states from `interval`, `line`, `circle` or `sphere`.
    """
    for kind, states in cell.items():
        if states.grid is not None:
            raise _inexact(what, f"{states.grid}, the states of kind {kind!r},")


def _inexact(what: str, which: str) -> NotApplicable:
    return NotApplicable(
        f"{what} has an exact answer, and continuous states have none: {which} stand for a continuous variable by "
        "the nodes of a quadrature rule. Use solve(chain.at(T=…, …)) for numbers, or declare discrete states such "
        "as clock(q)"
    )


def require_warm(cell: Mapping[str, StateSet], temperature: Value) -> None:
    """Refuse T = 0 where states are nodes of a quadrature rule.

    Raises
    ------
    NotApplicable
        A grid never holds the minimum of the energy itself, and its sums are no integrals there.
    """
    for kind, states in cell.items():
        if states.grid is not None and _any_zero(temperature):
            raise NotApplicable(
                f"T = 0 with continuous states: the nodes of {states.grid} (kind {kind!r}) need not hold the "
                "ground state, and no number of them resolves a Boltzmann factor there. Give T > 0 and double "
                "the nodes until the results settle"
            )


def _any_zero(temperature: Value) -> bool:
    return temperature == 0 if isinstance(temperature, (Fraction, float)) else bool((temperature == 0).any())
