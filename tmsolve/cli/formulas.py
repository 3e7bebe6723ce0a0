"""The quantities that ``tmsolve derive`` can write down, by their short and long names."""

from __future__ import annotations

import re
from collections.abc import Callable, Sequence
from dataclasses import dataclass
from typing import TYPE_CHECKING, Any

from ..errors import did_you_mean, listing
from .outcome import UsageError

if TYPE_CHECKING:
    from ..declare import Chain
    from ..symbolic.forms import ClosedForm

__all__ = ["NAMES", "Formula", "parse_formula"]

#: Short name -> (long name, symbol as text, as LaTeX); {} holds what stands in brackets.
_LOOKS = {
    "Z": ("partition_function", "Z_N", "Z_{N}"),
    "f": ("free_energy", "f", "f"),
    "u": ("internal_energy", "u", "u"),
    "s": ("entropy", "s", "s"),
    "c": ("specific_heat", "c", "c"),
    "xi": ("correlation_length", "xi", r"\xi"),
    "mean": ("mean", "<{}>", r"\langle {} \rangle"),
    "chi": ("susceptibility", "chi_{}", r"\chi_{{{}}}"),
    "derivative": ("derivative", "derivative of f by {}", r"\partial_{{{}}} f"),
    "eigenvalues": ("eigenvalues", "lambda", r"\lambda"),
    "polynomial": ("characteristic_polynomial", "det(lambda - M)", r"\det(\lambda - M)"),
    "recurrence": ("recurrence", "c", "c"),
    "matrix": ("matrix", "M", "M"),
    "blocks": ("blocks", "blocks", "blocks"),
}
#: Short names that take something in brackets, and what.
_BRACKETS = {"mean": "one observable", "chi": "one or two observables", "derivative": "parameters or T"}

#: As written in help and messages.
NAMES = "Z f u s c xi mean(a) chi(a) chi(a,b) derivative(h,T,…) eigenvalues polynomial recurrence matrix blocks"

_SHAPE = re.compile(r"^([A-Za-z_]\w*)\s*(?:\((.*)\))?$")


@dataclass(frozen=True)
class Formula:
    """One quantity as asked for.

    Attributes
    ----------
    name : str
        Canonical text such as ``"mean(m)"``.
    kind : str
        Short name without brackets.
    symbol, latex : str
        Left-hand side, as text and as LaTeX.
    compute : callable
        From a closed form to a sympy expression, or a sequence of them.
    """

    name: str
    kind: str
    symbol: str
    latex: str
    compute: Callable[[ClosedForm], Any]


def parse_formula(text: str, chain: Chain, cells: int | None) -> Formula:
    """Read a quantity such as ``mean(m)``; ``cells`` makes Z_N one of a given number of cells.

    Raises
    ------
    UsageError
        Unknown name, observable or parameter, or brackets where there should be none.
    """
    match = _SHAPE.match(text)
    if match is None:
        raise UsageError(f"--quantity takes names such as {NAMES}, got {text!r}")
    kind, inside = _short_name(match.group(1)), match.group(2)
    arguments = [part.strip() for part in inside.split(",") if part.strip()] if inside else []
    _check(kind, arguments, text, chain)
    name = f"{kind}({','.join(arguments)})" if arguments else kind
    long, symbol, latex = _LOOKS[kind]
    if kind == "Z" and cells is not None:
        symbol, latex = f"Z_{cells}", f"Z_{{{cells}}}"
    symbol, latex = (look.format(", ".join(arguments)) if arguments else look for look in (symbol, latex))
    return Formula(name, kind, symbol, latex, _computation(kind, long, arguments, cells))


def _short_name(name: str) -> str:
    for short, (long, *_) in _LOOKS.items():
        if name in (short, long):
            return short
    known = [*_LOOKS, *(long for long, *_ in _LOOKS.values())]
    raise UsageError(f"no quantity {name!r} to derive; there are {NAMES}.{did_you_mean(name, known)}")


def _check(kind: str, arguments: Sequence[str], text: str, chain: Chain) -> None:
    wanted = _BRACKETS.get(kind)
    if wanted is None:
        if arguments:
            raise UsageError(f"{kind} takes nothing in brackets, got {text!r}")
        return
    if not arguments or len(arguments) > {"mean": 1, "chi": 2}.get(kind, 6):
        raise UsageError(
            f"{kind} takes {wanted} in brackets, got {text!r}; observables are {listing(chain.observables)}"
        )
    known = [*chain.free, "T"] if kind == "derivative" else [*chain.observables]
    what = "free parameter" if kind == "derivative" else "observable"
    for name in arguments:
        if name not in known:
            raise UsageError(f"{text}: no {what} {name!r}; there are {listing(known)}.{did_you_mean(name, known)}")


def _computation(kind: str, long: str, arguments: Sequence[str], cells: int | None) -> Callable[[ClosedForm], Any]:
    if kind == "Z":
        return lambda form: form.partition_function(cells)
    if arguments:
        return lambda form: getattr(form, long)(*arguments)
    return lambda form: getattr(form, long)
