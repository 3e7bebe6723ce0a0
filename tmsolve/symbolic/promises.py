"""Time limits of questions to a closed form, in the user's words."""

from __future__ import annotations

from collections.abc import Callable
from typing import TypeVar

from ..errors import SolveError
from .deadline import TimeUp, limited

__all__ = ["finished", "not_finished"]

Result = TypeVar("Result")


def finished(what: str, seconds: float, compute: Callable[[], Result]) -> Result:
    """Compute within a time limit, or raise an error that names what was computed."""
    try:
        return limited(seconds, compute)
    except TimeUp:
        raise not_finished(what, seconds) from None


def not_finished(what: str, seconds: float) -> SolveError:
    """Return the error that says so."""
    return SolveError(
        f"{what} was not finished within {seconds:g} s; fix parameters with chain.fix(…), "
        "give a longer time_limit, or use solve(chain.at(…)) for numbers"
    )
