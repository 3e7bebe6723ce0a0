"""The ``--impurity`` option: other parameters in some cells, or cells of another model."""

from __future__ import annotations

import argparse
import re
from collections.abc import Iterable, Mapping
from dataclasses import dataclass
from fractions import Fraction
from typing import TYPE_CHECKING, Any

from ..errors import listing
from .model import Values, check_names, fill, load_model
from .outcome import UsageError
from .table import show_exact
from .words import assignments, exact, whole

if TYPE_CHECKING:
    from ..models import LoadedModel

__all__ = ["FORM", "HELP", "Impurity", "read_impurities"]

FORM = "CELLS:NAME=VALUE,…|CELLS=MODEL[:NAME=VALUE,…]"
HELP = (
    "other parameters in a cell, 0 to N-1, and in the bonds that start there; or with = a cell of another model, "
    "FILE or NAME, with the same kinds of site: its states, and the terms and bonds that start there. What is not "
    "given after it is taken from that model's defaults, T from the chain. CELLS is a cell, or several as in "
    "3+7+10-12; repeatable"
)
_CELLS = r"\d+(?:\s*-\s*\d+)?"


@dataclass(frozen=True)
class Impurity:
    """What stands in a cell.

    Attributes
    ----------
    given : dict or Point
        What the chain takes.
    model : str
        Name of the other model; empty where only parameters differ.
    values : mapping
        Parameters that the cell has of its own.
    """

    given: Any
    model: str
    values: Mapping[str, Any]

    @property
    def text(self) -> str:
        """What it is, in words."""
        shown = [f"{name} = {show_exact(value)}" for name, value in self.values.items()]
        return ", ".join([f"model {self.model}", *shown] if self.model else shown)

    @property
    def document(self) -> dict[str, Any]:
        """What it is, for JSON."""
        return {"model": self.model, "parameters": dict(self.values)} if self.model else dict(self.values)


def read_impurities(texts: Iterable[str], model: LoadedModel, values: Values, cells: int) -> dict[int, Impurity]:
    """Read all impurities, by cell.

    Raises
    ------
    UsageError
        Malformed, a cell twice or out of range, an unknown parameter, no such model.
    """
    found: dict[int, Impurity] = {}
    for written in texts:
        where, sign, rest = _split(written)
        impurity = _other_model(where, rest, values) if sign == "=" else _other_values(where, rest, model, values)
        for cell in _cells(where, cells):
            if cell in found:
                raise UsageError(f"--impurity {cell} is given twice; put all its parameters into one")
            found[cell] = impurity
    return dict(sorted(found.items()))


def _split(written: str) -> tuple[str, str, str]:
    """Split into cells, the sign behind them, and the rest."""
    parts = re.fullmatch(r"([^:=]*)([:=])(.+)", written.strip(), re.DOTALL)
    if parts is None or (parts[2] == "=" and re.search(r"[^\W\d]", parts[1])):
        raise UsageError(
            f"--impurity takes CELLS:NAME=VALUE,… such as 17:J=0.2, or CELLS=MODEL such as 17=guest.py, got {written!r}"
        )
    return parts[1].strip(), parts[2], parts[3].strip()


def _cells(written: str, cells: int) -> list[int]:
    found: list[int] = []
    for part in written.split("+"):
        first, _, last = part.partition("-") if re.fullmatch(_CELLS, part.strip()) else (part, "", "")
        low = whole(first.strip(), "the cell of --impurity", 0)
        high = whole(last.strip(), "the cell of --impurity", low) if last else low
        if high >= cells:
            raise UsageError(f"--impurity {written}: an impurity sits in one of the cells 0 to {cells - 1}, got {high}")
        found += range(low, high + 1)
    return found


def _numbers(where: str, rest: str) -> dict[str, Fraction]:
    given = assignments(rest.split(","), f"--impurity {where}", "J=0.2")
    return {name: exact(value, f"--impurity {where}{name}") for name, value in given.items()}


def _other_values(where: str, rest: str, model: LoadedModel, values: Values) -> Impurity:
    given = _numbers(f"{where}:", rest)
    check_names(given, model, "--impurity")
    return Impurity(given, "", {name: value for name, value in given.items() if value != values.all.get(name)})


def _other_model(where: str, rest: str, values: Values) -> Impurity:
    """Return a cell of another model at the temperature of the chain."""
    parts = re.fullmatch(r"(.+?):(\w+\s*=[^:]*)", rest, re.DOTALL)
    name, written = (parts[1], parts[2]) if parts else (rest, "")
    option = f"--impurity {where}={name}"
    try:
        other = load_model(argparse.Namespace(model=name, option=[]))
    except UsageError as error:
        raise UsageError(f"{option}: {error}") from error
    given = _numbers(f"{where}={name}:", written) if written else {}
    if "T" in given:
        raise UsageError(f"{option}:T=…: one temperature holds for the whole chain; give it by -p T=…")
    check_names(given, other, option)
    known = {*given, *other.chain.defaults, *other.defaults, *other.chain.fixed}
    missing = [parameter for parameter in other.chain.parameters if parameter not in known]
    if missing:
        raise UsageError(
            f"{option}: no value for {listing(missing)}, and model {other.name} has no default for it; give "
            f"{option}:{','.join(f'{parameter}=…' for parameter in missing)}"
        )
    own = fill({**given, "T": values.numbers["T"]}, other)
    shown = {parameter: value for parameter, value in own.all.items() if parameter != "T"}
    return Impurity(other.chain.at(**own.numbers), other.name, shown)
