"""Options of a model: the arguments of its ``chain`` function, converted by the type of their defaults."""

from __future__ import annotations

import inspect
from collections.abc import Callable, Mapping
from fractions import Fraction
from types import UnionType
from typing import Any

from ..errors import DeclarationError, did_you_mean, listing

_TRUTH = {"true": True, "yes": True, "1": True, "false": False, "no": False, "0": False}


def bind_options(function: Callable[..., Any], given: Mapping[str, Any], model: str) -> dict[str, Any]:
    """Return the value of every option: the given ones, converted, and the defaults of the others.

    Raises
    ------
    DeclarationError
        An option is unknown, missing, or of a value its type does not allow.
    """
    known = inspect.signature(function).parameters
    open_ended = any(parameter.kind is parameter.VAR_KEYWORD for parameter in known.values())
    named = {
        name: parameter.default
        for name, parameter in known.items()
        if parameter.kind in (parameter.POSITIONAL_OR_KEYWORD, parameter.KEYWORD_ONLY)
    }
    for name in given:
        if name not in named and not open_ended:
            raise DeclarationError(
                f"model {model} has no option {name!r}; it has {listing(named)}.{did_you_mean(name, named)}"
            )
    values = {name: default for name, default in named.items() if default is not inspect.Parameter.empty}
    missing = [name for name in named if name not in values and name not in given]
    if missing:
        raise DeclarationError(f"model {model} needs a value for its option {missing[0]!r}")
    for name, value in given.items():
        if name in values:
            or_name = _takes_name(known[name])
            is_name = or_name and isinstance(value, str) and value.strip().isidentifier()
            value = value.strip() if is_name else _converted(value, values[name], name, model, or_name)
        values[name] = value
    return values


def _takes_name(parameter: inspect.Parameter) -> bool:
    """Whether a number may be a symbol: its annotation says ``int | str``."""
    kinds = str(parameter.annotation) if isinstance(parameter.annotation, (str, UnionType)) else ""
    return type(parameter.default) is int and {"int", "str"} == {kind.strip() for kind in kinds.split("|")}


def _converted(value: Any, default: Any, name: str, model: str, or_name: bool = False) -> Any:
    kind = type(default)
    try:
        if kind is bool:
            return value if isinstance(value, bool) else _TRUTH[str(value).strip().lower()]
        if kind is int:
            return _whole(value)
        if kind in (float, Fraction, str) and not isinstance(value, bool):
            return kind(value)
        if isinstance(value, kind) or default is None:
            return value
    except (KeyError, ValueError, TypeError, OverflowError, ZeroDivisionError):
        pass
    expected = f"{_WORDS.get(kind, kind.__name__)} such as {default!r}"
    expected += ", or a name for it such as 'q'" if or_name else ""
    raise DeclarationError(f"option {name!r} of model {model} takes {expected}, got {value!r}")


def _whole(value: Any) -> int:
    number = Fraction(value)
    if isinstance(value, bool) or number.denominator != 1:
        raise ValueError
    return int(number)


_WORDS = {
    bool: "yes or no",
    int: "a whole number",
    float: "a number",
    Fraction: "a number",
    str: "a text",
}
