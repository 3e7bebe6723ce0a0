"""Laws of random parameters as one writes them on a command line."""

from __future__ import annotations

import re
from fractions import Fraction
from typing import Any

from ..declare.values import parse_value
from ..errors import DeclarationError, ParameterError, did_you_mean
from .kinds import Normal, Uniform

__all__ = ["read_law"]

_SHAPE = re.compile(r"^\s*([A-Za-z_]\w*)\s*\((.*)\)\s*$")
_FORMS = {
    "normal": "normal(MEAN,DEVIATION)",
    "uniform": "uniform(LOW,HIGH)",
    "choice": "choice(VALUE:PROBABILITY,…)",
}


def read_law(text: str) -> Any:
    """Read ``normal(1,0.5)``, ``uniform(-1,1)`` or ``choice(-1:0.5,1:0.5)``.

    Raises
    ------
    DeclarationError
        Another name, or arguments that are not numbers or out of range.

    Examples
    --------
    >>> read_law("uniform(-1,1)")
    Uniform(low=-1.0, high=1.0)
    >>> read_law("choice(-1:1/3, 1:2/3)")
    {Fraction(-1, 1): Fraction(1, 3), Fraction(1, 1): Fraction(2, 3)}
    """
    match = _SHAPE.match(text)
    name = match.group(1) if match else text.strip()
    if match is None or name not in _FORMS:
        raise DeclarationError(
            f"a law is written {', '.join(_FORMS.values())}, got {text!r}.{did_you_mean(name, _FORMS)}"
        )
    parts = [part.strip() for part in match.group(2).split(",")]
    if name == "choice":
        return _choice(text, parts)
    if len(parts) != 2:
        raise DeclarationError(f"{_FORMS[name]} takes two numbers, got {text!r}")
    first, second = (_number(part, text) for part in parts)
    if name == "normal":
        if second <= 0:
            raise DeclarationError(f"the deviation of {text!r} must be > 0; without spread the parameter is not random")
        return Normal(float(first), float(second))
    if first >= second:
        raise DeclarationError(f"{text!r} needs LOW < HIGH")
    return Uniform(float(first), float(second))


def _choice(text: str, parts: list[str]) -> dict[Fraction, Fraction]:
    chances: dict[Fraction, Fraction] = {}
    for part in parts:
        value, colon, chance = part.partition(":")
        if not colon:
            raise DeclarationError(f"{_FORMS['choice']} pairs every value with its probability; {part!r} in {text!r}")
        number = _number(value, text)
        if number in chances:
            raise DeclarationError(f"{value.strip()} stands twice in {text!r}; give it one probability")
        chances[number] = _number(chance, text)
    return chances


def _number(text: str, whole: str) -> Fraction:
    try:
        number = parse_value("law", text.strip().replace("−", "-"))
        if isinstance(number, Fraction):
            return number
        raise ParameterError(text)
    except ParameterError as cause:
        if "1e50" in str(cause):
            raise DeclarationError(
                f"{text.strip()!r} in {whole!r} is beyond 1e50; measure energies in a larger unit"
            ) from None
        raise DeclarationError(f"{text.strip()!r} in {whole!r} is not a number such as 0.5 or 2/3") from None
