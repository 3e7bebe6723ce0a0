"""Reading a user's function: which arguments are states, which are parameters."""

from __future__ import annotations

import inspect
from collections.abc import Callable
from dataclasses import dataclass
from typing import Any

from ..errors import DeclarationError

__all__ = ["Signature", "function_name", "read_signature"]

_POSITIONAL = (inspect.Parameter.POSITIONAL_ONLY, inspect.Parameter.POSITIONAL_OR_KEYWORD)


@dataclass(frozen=True)
class Signature:
    """Names of a function's parameters (its arguments after the local states).

    Attributes
    ----------
    parameters : tuple of str
        Parameter names in the order written, ``"T"`` included where the function takes it.
    defaults : dict
        Default values of those parameters that have one.
    """

    parameters: tuple[str, ...]
    defaults: dict[str, Any]


def function_name(function: Callable[..., Any]) -> str:
    """Return the name of a function as messages show it; a lambda with its line number.

    Examples
    --------
    >>> def coupling(s, t, J):
    ...     return -J * s * t
    >>> function_name(coupling)
    'coupling'
    """
    name = getattr(function, "__name__", None) or type(function).__name__
    code = getattr(function, "__code__", None)
    if name == "<lambda>" and code is not None:
        return f"<lambda> (line {code.co_firstlineno})"
    return str(name)


def read_signature(function: Callable[..., Any], sites: int) -> Signature:
    """Split a function's arguments into ``sites`` local states and named parameters.

    Raises
    ------
    DeclarationError
        The function cannot take that many states, or its parameters have no fixed names.

    Examples
    --------
    >>> read_signature(lambda s, t, J, h=0: 0, 2)
    Signature(parameters=('J', 'h'), defaults={'h': 0})

    A ufunc, ``np.cos`` say, takes states only:

    >>> import numpy as np
    >>> read_signature(np.cos, 1)
    Signature(parameters=(), defaults={})
    """
    name = function_name(function)
    if not callable(function):
        raise DeclarationError(
            f"expected a function of local states, got {function!r}; write for example lambda s, h: -h*s"
        )
    if _is_ufunc(function):
        _check_ufunc(name, function, sites)
        return Signature((), {})
    try:
        # np.vectorize hides the arguments of the function that it wraps.
        wrapped = getattr(function, "pyfunc", function)
        arguments = list(inspect.signature(wrapped).parameters.values())
    except (TypeError, ValueError) as cause:
        raise DeclarationError(
            f"the arguments of {name} cannot be read; wrap it in a function of your own with named parameters"
        ) from cause
    _reject_open_keywords(name, arguments)
    positional = [a for a in arguments if a.kind in _POSITIONAL]
    takes_any = any(a.kind is inspect.Parameter.VAR_POSITIONAL for a in arguments)
    if len(positional) < sites and not takes_any:
        raise DeclarationError(
            f"{name} takes {_plural(len(positional), 'argument')} but is placed on {_plural(sites, 'site')}; "
            "its first arguments must be the local states, one per site"
        )
    named = positional[sites:] if not takes_any else positional[min(sites, len(positional)) :]
    named = named + [a for a in arguments if a.kind is inspect.Parameter.KEYWORD_ONLY]
    unnamed = [a.name for a in named if a.kind is inspect.Parameter.POSITIONAL_ONLY]
    if unnamed:
        raise DeclarationError(f"parameter {unnamed[0]!r} of {name} is positional-only; parameters are passed by name")
    defaults = {a.name: a.default for a in named if a.default is not inspect.Parameter.empty}
    return Signature(tuple(a.name for a in named), defaults)


def _is_ufunc(function: Any) -> bool:
    """Whether a callable is a ufunc of NumPy or SciPy: its options are no parameters."""
    return isinstance(getattr(function, "nin", None), int) and isinstance(getattr(function, "nout", None), int)


def _check_ufunc(name: str, function: Any, sites: int) -> None:
    if function.nout != 1:
        raise DeclarationError(f"{name} returns {function.nout} values, but a term is one number")
    if function.nin != sites:
        states = ", ".join("stuv"[:sites]) if sites <= 4 else "…"
        raise DeclarationError(
            f"{name} takes {_plural(function.nin, 'argument')} but is placed on {_plural(sites, 'site')}; write a "
            f"function of the local states, then of parameters by name, such as lambda {states}, a: {name}(…)"
        )


def _reject_open_keywords(name: str, arguments: list[inspect.Parameter]) -> None:
    if any(a.kind is inspect.Parameter.VAR_KEYWORD for a in arguments):
        raise DeclarationError(
            f"{name} takes **keywords; parameter names are read from the signature, so write them out"
        )


def _plural(count: int, noun: str) -> str:
    return f"{count} {noun}" + ("" if count == 1 else "s")
