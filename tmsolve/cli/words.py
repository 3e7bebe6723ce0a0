"""Reading the small languages of the command line: NAME=VALUE, ranges, lists of readings."""

from __future__ import annotations

from collections.abc import Iterable
from fractions import Fraction

from .outcome import UsageError

__all__ = ["assignments", "exact", "name_and_value", "ranged", "split_names", "whole"]


def name_and_value(text: str, option: str, example: str) -> tuple[str, str]:
    """Split ``NAME=VALUE``; the example shows what is expected.

    Examples
    --------
    >>> name_and_value("J=1/3", "-p", "J=1")
    ('J', '1/3')
    """
    name, equals, value = (part.strip() for part in text.partition("="))
    if not equals:
        raise UsageError(f"{option} takes NAME=VALUE such as {example}, got {text!r}")
    if not name.isidentifier():
        raise UsageError(f"{option} takes NAME=VALUE such as {example}; {name!r} is not a name (in {text!r})")
    if not value:
        raise UsageError(f"{option} {name}= has no value; write for example {option} {example}")
    return name, value


def assignments(texts: Iterable[str], option: str, example: str) -> dict[str, str]:
    """Collect several ``NAME=VALUE``; a name may stand once."""
    values: dict[str, str] = {}
    for text in texts:
        name, value = name_and_value(text, option, example)
        if name in values:
            raise UsageError(f"{option} {name}= is given twice, {values[name]} and {value}; keep one of them")
        values[name] = value
    return values


def exact(text: str, what: str) -> Fraction:
    """Read a number exactly: decimal, fraction or with an exponent; a typographic minus counts as one.

    Examples
    --------
    >>> exact("2/5", "-p J"), exact("-1e-3", "-p J")
    (Fraction(2, 5), Fraction(-1, 1000))
    """
    try:
        return Fraction(text.strip().replace("−", "-"))
    except (ValueError, ZeroDivisionError):
        comma = "; use a point for decimals, and one option per value" if "," in text else ""
        raise UsageError(f"{what} must be a finite number such as 0.4, 2/5 or 1e-3, got {text!r}{comma}") from None


def whole(text: str, what: str, least: int, most: int | None = None) -> int:
    """Read a whole number within limits.

    Examples
    --------
    >>> whole("12", "--digits", 1, 17)
    12
    """
    allowed = f"from {least} to {most}" if most is not None else f">= {least}"
    try:
        number = int(text)
    except ValueError:
        number = least - 1
    if number < least or (most is not None and number > most):
        raise UsageError(f"{what} must be a whole number {allowed}, got {text!r}")
    return number


def ranged(text: str, option: str, example: str) -> tuple[str, list[str]]:
    """Split ``NAME=A:B:…`` into the name and its parts.

    Examples
    --------
    >>> ranged("T=0.1:2", "--along", "T=0.1:5")
    ('T', ['0.1', '2'])
    """
    name, value = name_and_value(text, option, example)
    return name, [part.strip() for part in value.split(":")]


def split_names(texts: Iterable[str], option: str) -> list[str]:
    """Split lists of quantities at commas that are not inside brackets; each name once.

    Examples
    --------
    >>> split_names(["free_energy,susceptibility(m,q)", "mean(m)"], "--read")
    ['free_energy', 'susceptibility(m,q)', 'mean(m)']
    """
    names: list[str] = []
    for text in texts:
        for part in _outside_brackets(text, option):
            if not part:
                raise UsageError(f"{option} {text!r} has an empty name; separate names by single commas")
            if part not in names:
                names.append(part)
    return names


def _outside_brackets(text: str, option: str) -> list[str]:
    parts, depth = [""], 0
    for letter in text:
        depth += (letter == "(") - (letter == ")")
        if letter == "," and depth == 0:
            parts.append("")
        else:
            parts[-1] += letter
        if depth < 0:
            break
    if depth:
        missing = "a closing" if depth > 0 else "an opening"
        raise UsageError(f"{option} {text!r} lacks {missing} bracket")
    return [part.strip() for part in parts]
