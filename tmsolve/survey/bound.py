"""What a question about a chain needs bound before it can be answered."""

from __future__ import annotations

from collections.abc import Sequence
from fractions import Fraction
from typing import Any

from ..declare import Chain
from ..errors import ParameterError, listing, unknown_parameter
from ..observe.solution import Solution

__all__ = ["require_bound", "require_field", "require_solution"]


def require_field(verb: str, chain: Any, field: Any) -> None:
    """Refuse what is no chain, and a field that is no free parameter of it.

    Raises
    ------
    ParameterError
        With the names that the chain has.
    """
    if not isinstance(chain, Chain):
        raise ParameterError(f"{verb} takes a chain, got {chain!r}; bind its other parameters with chain.fix(…)")
    if field == "T":
        raise ParameterError(
            f"{verb}: field= names a parameter, and T is the temperature; name one of {listing(chain.parameters)}"
        )
    if field not in chain.parameters:
        raise unknown_parameter(field, chain.parameters)
    if field in chain.fixed:
        raise ParameterError(f"{field!r} is fixed in this chain and cannot vary; start from the chain before fix(…)")


def require_bound(verb: str, chain: Any, running: Sequence[str]) -> None:
    """Refuse a chain in which anything but the running names lacks a value.

    Parameters
    ----------
    running : sequence of str
        Parameters, and ``"T"`` where it runs, that are given later.

    Raises
    ------
    ParameterError
        What is missing, and how to give it; ``T`` fixed where it runs.
    """
    if not isinstance(chain, Chain):
        raise ParameterError(f"{verb} takes a chain, got {chain!r}; bind its parameters with chain.fix(…)")
    if "T" in running and "T" in chain.fixed:
        raise ParameterError(
            f"T is fixed in this chain, but {verb} takes it itself; start from the chain before fix(T=…)"
        )
    known = {*chain.fixed, *chain.defaults, *running}
    missing = [name for name in (*chain.parameters, "T") if name not in known]
    if missing:
        raise ParameterError(
            f"no value for {listing(missing)}; {verb} needs {'it' if len(missing) == 1 else 'them'} fixed: "
            f"chain.fix({', '.join(f'{name}=…' for name in missing)})"
        )
    for name, value in {**chain.defaults, **chain.fixed}.items():
        if name not in running and not isinstance(value, Fraction):
            raise ParameterError(f"parameter {name!r} must be a finite number, got {value!r}")


def require_solution(verb: str, solution: Any) -> None:
    """Refuse what is no solution.

    Raises
    ------
    ParameterError
        With how to make one.
    """
    if not isinstance(solution, Solution):
        raise ParameterError(f"{verb} takes a solution, got {solution!r}; make one with solve(chain.at(T=…, …))")
