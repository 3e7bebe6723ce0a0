"""What can go wrong, in the words of the person who has to mend it.

Every message says what was got, what was expected and what to do next. All
classes derive from `TmsolveError`, and each also from the built-in exception
that a caller would expect.
"""

from __future__ import annotations

import difflib
from collections.abc import Iterable
from typing import Any

__all__ = [
    "DeclarationError",
    "MissingExtra",
    "NotApplicable",
    "ParameterError",
    "SolveError",
    "TmsolveError",
    "TooLargeError",
    "did_you_mean",
    "listing",
    "unknown_parameter",
]


class TmsolveError(Exception):
    """Base class of every error that tmsolve raises on purpose."""


class DeclarationError(TmsolveError, ValueError):
    """A chain, state set, term or model is declared in a way that has no meaning."""


class ParameterError(TmsolveError, KeyError):
    """A parameter is unknown, missing or has a value that is not a number."""

    def __str__(self) -> str:
        # KeyError quotes its argument, which would wrap a sentence in quotes.
        return str(self.args[0]) if self.args else ""


class SolveError(TmsolveError, RuntimeError):
    """A quantity could not be computed at some point.

    Parameters
    ----------
    message : str
        What failed and where.
    partial : object, optional
        Results that had been computed before the failure.
    """

    def __init__(self, message: str, partial: Any = None) -> None:
        super().__init__(message)
        self.partial = partial


class TooLargeError(TmsolveError, ValueError):
    """The problem is larger than the chosen method accepts.

    Parameters
    ----------
    message : str
        The size met and what to do.
    limit : int, optional
        The largest size that the method accepts.
    """

    def __init__(self, message: str, limit: int | None = None) -> None:
        super().__init__(message)
        self.limit = limit


class NotApplicable(TmsolveError, ValueError):
    """The question has no answer for this chain or at this point."""


class MissingExtra(TmsolveError, ImportError):
    """An optional library is needed and not installed."""


def did_you_mean(name: str, choices: Iterable[str]) -> str:
    """Return ``" Did you mean 'x'?"`` for the nearest of some names, or an empty string.

    Examples
    --------
    >>> did_you_mean("d", ["J", "D", "h"])
    " Did you mean 'D'?"
    >>> did_you_mean("zzz", ["J"])
    ''
    """
    names = [str(choice) for choice in choices]
    lowered = {other.lower(): other for other in reversed(names)}
    if name.lower() in lowered:
        return f" Did you mean {lowered[name.lower()]!r}?"
    close = difflib.get_close_matches(name, names, n=1, cutoff=0.6)
    close = close or [lowered[c] for c in difflib.get_close_matches(name.lower(), lowered, n=1, cutoff=0.6)]
    return f" Did you mean {close[0]!r}?" if close else ""


def unknown_parameter(name: object, parameters: Iterable[str]) -> ParameterError:
    """Return the error for a name that is neither a parameter of a chain nor ``T``."""
    names = list(parameters)
    hint = did_you_mean(str(name), [*names, "T"])
    return ParameterError(f"no parameter {name!r}; this chain has {listing(names)} and T.{hint}")


def listing(names: Iterable[object]) -> str:
    """Join names for a sentence; ``"none"`` when there are none.

    Examples
    --------
    >>> listing(["J", "D", "h"])
    'J, D, h'
    """
    return ", ".join(str(name) for name in names) or "none"
