"""``tmsolve disorder -p T=0``: ground states averaged over disorder; energies, means and domains."""

from __future__ import annotations

import argparse
import sys
from collections.abc import Mapping
from dataclasses import dataclass
from fractions import Fraction
from typing import TYPE_CHECKING, Any

from ..errors import NotApplicable, ParameterError, TmsolveError
from .disorder_averages import Averages, Averaging, counts
from .disorder_shown import head, origin, shown
from .jsontext import json_text
from .model import Values
from .outcome import DONE, SOME_FAILED, UsageError
from .parser import Parser
from .table import Number, show_exact, table
from .together import refuse_beside
from .words import split_names, whole

if TYPE_CHECKING:
    from ..disorder.averages import Average
    from ..disorder.cold_domains import GroundDomains
    from ..disorder.ground_energy import DisorderedGround
    from ..disorder.laws import Law
    from ..models import LoadedModel

__all__ = ["GroundAveraging", "add_ground", "read_ground", "solve_ground"]

_OWN_METHOD = {"method": "ground states have a method of their own"}
#: LaTeX and unit.
_LOOKS = {
    "energy": ("e", "energy"),
    "residual_entropy": ("s", "1"),
    "mean": (r"\langle {} \rangle", "1"),
    "overlap": (r"\overline{{\langle {} \rangle^2}}", "1"),
    "walls": (r"\rho_\mathrm{{w}}({})", "1"),
    "mean_length": (r"\bar{{\ell}}({})", "cells"),
}


def add_ground(parser: Parser) -> None:
    """Add the option that only ground states have."""
    parser.add_argument(
        "--longest",
        metavar="N",
        help="at T = 0, add to every domains(a) the probabilities of the lengths 1 to N of its domains",
    )


@dataclass(frozen=True)
class GroundAveraging(Averaging):
    """Averages over ground states, by the names that they have at T = 0."""

    def at(self, numbers: Mapping[str, Any], seed: int | None = None) -> Averages:
        """Average with these values of the parameters that are not random."""
        from ..disorder.averages import Average

        ground = self.ground(numbers, seed)
        found: dict[str, Average] = {}
        failures: dict[str, TmsolveError] = {}
        for name, (what, arguments) in self.wanted.items():
            try:
                one = _read(ground, what, arguments)
            except TmsolveError as error:
                failures[name] = error
                continue
            found[name] = one if isinstance(one, Average) else Average(float(one), 0.0)
        facts = {"cells": ground.cells, "replicas": ground.replicas, "seed": ground.seed}
        return Averages(found, failures, {**facts, "notes": list(ground.notes)})

    def ground(self, numbers: Mapping[str, Any], seed: int | None = None) -> DisorderedGround:
        """Return the ground states with these values of the parameters that are not random."""
        from ..disorder.ground_energy import disordered_ground_state

        known = self.counts if seed is None else {**self.counts, "rng": seed}
        return disordered_ground_state(self.model.chain.fix(**numbers), self.laws, **known)

    def look(self, name: str) -> tuple[str, str]:
        """Return the LaTeX symbol and the unit of an average."""
        what, arguments = self.wanted[name]
        latex, unit = _LOOKS[what]
        return latex.format(*arguments), unit


def read_ground(
    arguments: argparse.Namespace, model: LoadedModel, laws: Mapping[str, Law], tables: bool
) -> GroundAveraging:
    """Read what is wanted of ground states; domains as a table, or the numbers of which it consists.

    Raises
    ------
    UsageError
        Unknown averages, or options without effect.
    """
    from ..disorder.quantities import ground_named, ground_names

    refuse_beside(arguments, "-p T=0", _OWN_METHOD)
    names = split_names(arguments.read, "--read")
    try:
        wanted = {name: ground_named(name) for name in names or ground_names(model.chain, laws)}
    except ParameterError as error:
        raise UsageError(f"--read: {error}") from error
    if not tables:
        if any(what == "domains" for what, _ in wanted.values()) and names:
            raise UsageError("--read domains(a) is a table; along an axis read walls(a) and mean_length(a)")
        wanted = dict(_scalar(name, what, inside) for name, (what, inside) in wanted.items())
    return GroundAveraging(model, laws, "ground", counts(arguments), wanted)


def _scalar(name: str, what: str, arguments: tuple[Any, ...]) -> tuple[str, tuple[str, tuple[Any, ...]]]:
    return (f"walls({arguments[0]})", ("walls", arguments)) if what == "domains" else (name, (what, arguments))


def _read(ground: DisorderedGround, what: str, arguments: tuple[Any, ...]) -> Fraction | Average:
    if what in ("walls", "mean_length"):
        domains = ground.domains(*arguments)
        return domains.walls if what == "walls" else domains.mean_length()
    found = getattr(ground, what)
    number: Fraction | Average = found(*arguments) if arguments else found
    return number


def solve_ground(arguments: argparse.Namespace, model: LoadedModel, values: Values, laws: Mapping[str, Any]) -> int:
    """Average over ground states and print."""
    averaging = read_ground(arguments, model, laws, tables=True)
    longest = 0 if arguments.longest is None else whole(arguments.longest, "--longest", 1)
    if longest and not any(what == "domains" for what, _ in averaging.wanted.values()):
        raise UsageError("--longest belongs to domains(a); add it to --read, or leave --longest out")
    ground = averaging.ground(values.numbers)
    found: dict[str, Fraction | Average] = {}
    tables: dict[str, _Table] = {}
    failures: dict[str, TmsolveError] = {}
    for name, (what, inside) in averaging.wanted.items():
        try:
            if what == "domains":
                tables[name] = _Table.of(ground.domains(*inside), longest)
            else:
                found[name] = _read(ground, what, inside)
        except TmsolveError as error:
            failures[name] = error
    if failures and not found and not tables:
        raise next(iter(failures.values()))
    facts = {"cells": ground.cells, "replicas": ground.replicas, "seed": ground.seed}
    if arguments.json:
        start = {**origin(arguments, model, values, laws), "method": averaging.method, **facts}
        failed = {name: str(why) for name, why in failures.items()}
        print(json_text({**start, **_document(averaging, ground, found, tables), "failed": failed}))
    else:
        rows = [[name, _text(name, one), averaging.look(name)[1]] for name, one in found.items()]
        parts = [head(model, values, laws, facts), *([table(rows, ["average", "value", "unit"])] if rows else [])]
        parts += [f"{name}\n{one.text()}" for name, one in tables.items()]
        print("\n\n".join([*parts, _how(ground), *ground.notes]))
    sys.stdout.flush()
    for name, why in failures.items():
        print(f"tmsolve disorder: {name} failed: {why}", file=sys.stderr)
    return SOME_FAILED if failures else DONE


def _document(
    averaging: GroundAveraging,
    ground: DisorderedGround,
    found: Mapping[str, Fraction | Average],
    tables: Mapping[str, _Table],
) -> dict[str, Any]:
    from .._version import __version__

    return {
        "messages": ground.messages,
        "results": {name: _json(one) for name, one in found.items()},
        "units": {name: averaging.look(name)[1] for name in found},
        "domains": {name: one.document() for name, one in tables.items()},
        "notes": list(ground.notes),
        "tmsolve": __version__,
    }


def _how(ground: DisorderedGround) -> str:
    if ground.messages is None:
        return "the message of least energies takes too many values: all is sampled"
    return f"the message of least energies takes {ground.messages} values; numbers without brackets are exact"


def _text(name: str, number: Fraction | Average | None) -> Number:
    from ..disorder.cold_averages import written

    if number is None:
        return Number("-")
    return Number(written(number) if isinstance(number, Fraction) else shown(name, number))


def _json(number: Fraction | Average | None) -> dict[str, Any] | None:
    if number is None:
        return None
    if isinstance(number, Fraction):
        return {"value": float(number), "error": 0.0, "exact": str(number)}
    return {"value": number.value, "error": number.error, "exact": None}


@dataclass(frozen=True)
class _Table:
    """Domains of one observable: a row for every value, and one for all.

    Attributes
    ----------
    values : tuple of Fraction
        One row each; the last row is that of all together.
    columns : dict
        Numbers by column and row; ``None`` where a value has no domains.
    lengths : list of tuples
        Probabilities of the lengths 1, 2, …, by row.
    """

    observable: str
    values: tuple[Fraction, ...]
    columns: dict[str, list[Fraction | Average | None]]
    lengths: list[tuple[Fraction | Average, ...] | None]

    @classmethod
    def of(cls, domains: GroundDomains, longest: int) -> _Table:
        """Read a table."""
        rows = [*domains.values, None]
        columns: dict[str, list[Fraction | Average | None]] = {
            "fraction": [Fraction(1) if value is None else domains.fraction(value) for value in rows],
            "density": [domains.density(value) for value in rows],
            "mean_length": [_or_none(lambda value=value: domains.mean_length(value)) for value in rows],
        }
        lengths = [_or_none(lambda value=value: domains.probabilities(value, longest)) for value in rows if longest]
        return cls(domains.observable, domains.values, columns, lengths)

    @property
    def labels(self) -> list[str]:
        """What the rows are called."""
        return [*map(show_exact, self.values), "all"]

    def document(self) -> dict[str, Any]:
        """Return the table for JSON."""
        found: dict[str, Any] = {"values": [*map(float, self.values), "all"]}
        found |= {name: [_json(one) for one in column] for name, column in self.columns.items()}
        if self.lengths:
            found["probabilities"] = [None if row is None else [_json(one) for one in row] for row in self.lengths]
        return found

    def text(self) -> str:
        """Return the table as text."""
        heads = [self.observable, "fraction of cells", "domains per cell", "mean length"]
        rows = [
            [Number(label), *(_text("", column[i]) for column in self.columns.values())]
            for i, label in enumerate(self.labels)
        ]
        parts = [table(rows, heads, indent="  ")]
        count = max((len(row) for row in self.lengths if row is not None), default=0)
        if count:
            heads = ["length", *(f"P({label})" for label in self.labels)]
            rows = [
                [Number(str(k + 1)), *(_text("", None if row is None else row[k]) for row in self.lengths)]
                for k in range(count)
            ]
            parts.append(table(rows, heads, indent="  "))
        return "\n\n".join(parts)


def _or_none(read: Any) -> Any:
    try:
        return read()
    except NotApplicable:
        return None
