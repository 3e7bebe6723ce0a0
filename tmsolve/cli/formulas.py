"""The quantities that ``tmsolve derive`` can write down, by their short and long names."""

from __future__ import annotations

import re
from collections.abc import Callable, Sequence
from dataclasses import dataclass
from typing import TYPE_CHECKING, Any

from ..errors import did_you_mean, listing
from .outcome import UsageError

if TYPE_CHECKING:
    from .derivation import Derivation

__all__ = ["NAMES", "OF_FORM", "Formula", "parse_formula"]


@dataclass(frozen=True)
class _Kind:
    """A sort of quantity: its long name, what stands left of the equals sign, and what may stand in brackets."""

    long: str
    symbol: str
    latex: str
    brackets: str = ""
    least: int = 0
    most: int = 0


#: By short name; {} holds what stands in brackets.
_KINDS = {
    "Z": _Kind("partition_function", "Z_N", "Z_{N}"),
    "f": _Kind("free_energy", "f", "f"),
    "u": _Kind("internal_energy", "u", "u"),
    "s": _Kind("entropy", "s", "s"),
    "c": _Kind("specific_heat", "c", "c"),
    "xi": _Kind("correlation_length", "xi", r"\xi"),
    "mean": _Kind("mean", "<{}>", r"\langle {} \rangle", "one observable", 1, 1),
    "chi": _Kind("susceptibility", "chi_{}", r"\chi_{{{}}}", "one or two observables", 0, 2),
    "corr": _Kind("correlation", "<{}; r>", r"\langle {} \rangle_r", "one or two observables", 0, 2),
    "derivative": _Kind("derivative", "derivative of f by {}", r"\partial_{{{}}} f", "parameters or T", 1, 6),
    "eigenvalues": _Kind("eigenvalues", "lambda", r"\lambda"),
    "polynomial": _Kind("characteristic_polynomial", "det(lambda - M)", r"\det(\lambda - M)"),
    "recurrence": _Kind("recurrence", "c", "c"),
    "generating": _Kind("generating_function", "sum of Z_N x**N", r"\sum_N Z_N x^N"),
    "matrix": _Kind("matrix", "M", "M"),
    "blocks": _Kind("blocks", "blocks", "blocks"),
    "series": _Kind("series", "series of {}", r"{}", "one quantity such as free_energy or mean(m)", 0, 1),
    "limits": _Kind("limits", "limits", "limits"),
    "counts": _Kind("counts", "counts", "counts", "energy and observables", 0, 9),
    "zeros": _Kind("zeros", "zeros", "zeros", "one parameter", 0, 1),
}

#: As written in help and messages.
NAMES = (
    "Z f u s c xi mean(a) chi(a) chi(a,b) corr(a) corr(a,b) derivative(h,T,…) eigenvalues polynomial recurrence "
    "generating matrix blocks series(f) limits counts(energy,a) zeros(h)"
)

#: Kinds that are read off the closed form.
OF_FORM = frozenset(_KINDS) - {"series", "limits", "counts", "zeros"}

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
    arguments : tuple of str
        What stood in brackets.
    symbol, latex : str
        Left-hand side, as text and as LaTeX.
    compute : callable
        Derives it: a sympy expression, a sequence of them, or a result of its own.
    """

    name: str
    kind: str
    arguments: tuple[str, ...]
    symbol: str
    latex: str
    compute: Callable[[], Any]


def parse_formula(text: str, work: Derivation) -> Formula:
    """Read a quantity such as ``mean(m)``; the bare name of an observable is its mean.

    Raises
    ------
    UsageError
        Unknown name, observable or parameter, or brackets where there should be none.
    """
    match = _SHAPE.match(text)
    if match is None:
        raise UsageError(f"--quantity takes names such as {NAMES}, got {text!r}")
    if match.group(2) is None and text in work.chain.observables and text not in _KINDS:
        match = _SHAPE.match(f"mean({text})")
        assert match is not None
    kind, inside = _short_name(match.group(1), work), match.group(2)
    arguments = _split(inside) if inside else []
    _check_number(kind, arguments, text, work)
    arguments = _complete(kind, arguments, text, work)
    _check_names(kind, arguments, text, work)
    if kind in ("counts", "zeros"):
        work.length(kind)
    shown = f"{kind}({','.join(arguments)})" if arguments else kind
    look = _KINDS[kind]
    symbol, latex = (part.format(", ".join(arguments)) if arguments else part for part in (look.symbol, look.latex))
    if kind == "Z" and work.cells is not None:
        symbol, latex = f"Z_{work.cells}", f"Z_{{{work.cells}}}"
    return Formula(shown, kind, tuple(arguments), symbol, latex, _computation(kind, look.long, arguments, work))


def _split(inside: str) -> list[str]:
    """Split at commas outside of brackets."""
    parts, depth = [""], 0
    for letter in inside:
        depth += (letter == "(") - (letter == ")")
        if letter == "," and not depth:
            parts.append("")
        else:
            parts[-1] += letter
    return [part.strip() for part in parts if part.strip()]


def _short_name(name: str, work: Derivation) -> str:
    for short, kind in _KINDS.items():
        if name in (short, kind.long):
            return short
    known = [*_KINDS, *(kind.long for kind in _KINDS.values()), *work.chain.observables]
    raise UsageError(f"no quantity {name!r} to derive; there are {NAMES}.{did_you_mean(name, known)}")


def _check_number(kind: str, arguments: Sequence[str], text: str, work: Derivation) -> None:
    look = _KINDS[kind]
    if not look.brackets and arguments:
        raise UsageError(f"{kind} takes nothing in brackets, got {text!r}")
    if not look.least <= len(arguments) <= look.most:
        known = f"; observables are {listing(work.chain.observables)}" if "observable" in look.brackets else ""
        raise UsageError(f"{kind} takes {look.brackets} in brackets, got {text!r}{known}")


def _complete(kind: str, arguments: list[str], text: str, work: Derivation) -> list[str]:
    """Say which observable or parameter is meant where there is only one."""
    if arguments or kind not in ("chi", "corr", "zeros", "series"):
        return arguments
    if kind == "series":
        return ["free_energy"]
    known = [*work.chain.free] if kind == "zeros" else [*work.chain.observables]
    what = "free parameter" if kind == "zeros" else "observable"
    if len(known) == 1:
        return known
    usual = "h" if kind == "zeros" else "m"
    if usual in known:
        return [usual]
    raise UsageError(f"{text} needs one {what} in brackets; there are {listing(known)}")


def _check_names(kind: str, arguments: Sequence[str], text: str, work: Derivation) -> None:
    chain = work.chain
    if kind in ("mean", "chi", "corr"):
        known, what = [*chain.observables], "observable"
    elif kind in ("derivative", "zeros"):
        known, what = [*chain.free, "T"], "free parameter"
    else:
        return
    for name in arguments:
        if name not in known:
            raise UsageError(f"{text}: no {what} {name!r}; there are {listing(known)}.{did_you_mean(name, known)}")


def _computation(kind: str, long: str, arguments: Sequence[str], work: Derivation) -> Callable[[], Any]:
    if kind == "Z":
        return work.partition_function
    if kind == "series":
        name = arguments[0]
        return lambda: work.series(_KINDS[name].long if name in _KINDS else name)
    if kind == "counts":
        return lambda: work.counts(tuple(arguments))
    if kind in ("corr", "eigenvalues", "limits", "zeros", "generating"):
        return lambda: getattr(work, long)(*arguments)
    if arguments:
        return lambda: getattr(work.form, long)(*arguments)
    return lambda: getattr(work.form, long)
