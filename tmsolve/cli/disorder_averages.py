"""Averages over disorder as ``tmsolve disorder`` asks for them: which, by what method, in what units."""

from __future__ import annotations

import argparse
from collections.abc import Mapping
from dataclasses import dataclass, field
from typing import TYPE_CHECKING, Any

from ..errors import NotApplicable, ParameterError, TmsolveError, did_you_mean
from .outcome import UsageError
from .parser import Parser
from .together import refuse_beside
from .words import split_names, whole

if TYPE_CHECKING:
    from ..declare import Chain
    from ..disorder.averages import Average
    from ..disorder.laws import Law
    from ..models import LoadedModel

__all__ = ["Averages", "Averaging", "add_averaging", "check_method", "counts", "read_averaging"]

METHODS = ("sample", "exact", "annealed")
#: What is taken when nothing is said.
_CELLS, _REPLICAS = 500, 128
_NOTHING_DRAWN = "nothing is drawn at random, the average is an integral"
#: Averages that one method alone knows.
_ONLY_BY = dict.fromkeys(("lyapunov", "correlation", "glass_susceptibility", "probability_derivative"), "sample")
#: Averages that infinite chains without disorder do not have: LaTeX and unit.
_LOOKS = {
    "lyapunov": (r"\gamma", "1"),
    "average_correlation_length": (r"\bar{\xi}", "cells"),
    "correlation": ("C", ""),
    "glass_susceptibility": (r"\chi_{SG}", ""),
    "derivative": (r"\partial f", ""),
    "probability_derivative": (r"\partial f/\partial p", "energy"),
}


def add_averaging(parser: Parser) -> None:
    """Add the options that say what is averaged and how."""
    parser.add_argument("--cells", metavar="N", help=f"cells averaged over per replica. Default: {_CELLS}")
    parser.add_argument("--replicas", metavar="N", help=f"independent chains, at least 2. Default: {_REPLICAS}")
    parser.add_argument("--seed", metavar="N", help="the same seed gives the same numbers. Default: another every time")
    parser.add_argument(
        "--method",
        metavar="NAME",
        help="sample: random products; exact: the integral equation, for a cut of two states; annealed: the disorder "
        "in equilibrium with the chain, which is another average. Default: sample",
    )
    parser.add_argument(
        "--read",
        metavar="NAME,…",
        action="append",
        default=[],
        help="averages, separated by commas: free_energy internal_energy entropy specific_heat mean(a) "
        "susceptibility(a) susceptibility(a,b) correlation_length average_correlation_length correlation(a,b,r) "
        "glass_susceptibility(a) derivative(p) derivative(p,q) probability_derivative(p,VALUE,INSTEAD) lyapunov(k); "
        "a, b are observables, r is a distance in cells, p, q are parameters or T; the probability moved is that of a "
        "random parameter to take VALUE instead of INSTEAD. Default: free_energy "
        "internal_energy entropy specific_heat correlation_length, and of every observable mean(a) and "
        "susceptibility(a). At T = 0: energy residual_entropy mean(a) overlap(a) walls(a) mean_length(a) domains(a); "
        "overlap is the squared mean in a cell, averaged; walls are the places per cell where a changes, mean_length "
        "is that of the cells between them, domains a table by value. Default: energy residual_entropy, and of every "
        "observable mean(a) and domains(a)",
    )


@dataclass(frozen=True)
class Averages:
    """Averages at one point, why others could not be had, and what to tell about their making."""

    found: Mapping[str, Average]
    failures: Mapping[str, TmsolveError]
    facts: Mapping[str, Any] = field(default_factory=dict)


@dataclass(frozen=True)
class Averaging:
    """What is averaged over the laws of some parameters, and how.

    Attributes
    ----------
    wanted : mapping of str to (str, tuple)
        Name as printed to method of the result and its arguments.
    """

    model: LoadedModel
    laws: Mapping[str, Law]
    method: str
    counts: Mapping[str, Any]
    wanted: Mapping[str, tuple[str, tuple[Any, ...]]]

    def at(self, numbers: Mapping[str, Any], seed: int | None = None) -> Averages:
        """Average with these values of the parameters that are not random."""
        from ..disorder.quantities import evaluate

        averages, facts = self._averages(self.model.chain.fix(**numbers), seed)
        found: dict[str, Average] = {}
        failures: dict[str, TmsolveError] = {}
        for name, (method, arguments) in self.wanted.items():
            try:
                found[name] = evaluate(averages, method, arguments)
            except TmsolveError as error:
                failures[name] = self._advised(method, error)
        return Averages(found, failures, facts)

    def _advised(self, name: str, error: TmsolveError) -> TmsolveError:
        """Name the method that knows an average, where it is another one."""
        other = _ONLY_BY.get(name, self.method)
        return error if other == self.method else NotApplicable(f"{error}; take --method {other}")

    def _averages(self, chain: Chain, seed: int | None) -> tuple[Any, dict[str, Any]]:
        """Return what the readings are read from, and what to tell about it."""
        calls = self.wanted.values()
        pairs = [arguments for name, arguments in calls if name == "derivative" and len(arguments) == 2]
        if self.method == "annealed":
            from ..answer.solve import solve
            from ..disorder.annealed import annealed

            return solve(annealed(chain, self.laws).at()), {}
        if self.method == "exact":
            from ..disorder.stationary import stationary_message

            return stationary_message(chain, self.laws, derivatives=pairs), {}
        from ..disorder.quenched import quenched

        counts = self.counts if seed is None else {**self.counts, "rng": seed}
        averages = quenched(chain, self.laws, **counts, derivatives=pairs)
        facts = {"cells": averages.cells, "replicas": averages.replicas, "seed": averages.seed}
        return averages, {**facts, "burn_in": averages.burn_in, "notes": list(averages.notes)}

    def look(self, name: str) -> tuple[str, str]:
        """Return the LaTeX symbol and the unit of an average."""
        from ..observe.readings import parse_reading

        method = self.wanted[name][0]
        if method in _LOOKS:
            return _LOOKS[method]
        reading = parse_reading(name, self.model.chain)
        return reading.latex, reading.unit


def check_method(arguments: argparse.Namespace) -> None:
    """Refuse methods that there are not."""
    if arguments.method not in (None, *METHODS):
        hint = did_you_mean(arguments.method, METHODS)
        raise UsageError(f"--method is one of {', '.join(METHODS)}, got {arguments.method!r}.{hint}")


def read_averaging(arguments: argparse.Namespace, model: LoadedModel, laws: Mapping[str, Law]) -> Averaging:
    """Read which averages are wanted and by what method.

    Raises
    ------
    UsageError
        Unknown averages, or options that the method has no use for.
    """
    from ..disorder.quantities import average_named, average_names

    method = arguments.method or METHODS[0]
    if method != "sample":
        refuse_beside(arguments, f"--method {method}", dict.fromkeys(("cells", "replicas", "seed"), _NOTHING_DRAWN))
    names = split_names(arguments.read, "--read") or average_names(model.chain, laws)
    try:
        wanted = {name: average_named(name) for name in names}
    except ParameterError as error:
        raise UsageError(f"--read: {error}") from error
    return Averaging(model, laws, method, counts(arguments), wanted)


def counts(arguments: argparse.Namespace) -> dict[str, Any]:
    """Return cells, replicas and seed."""
    return {
        "cells": _CELLS if arguments.cells is None else whole(arguments.cells, "--cells", 1),
        "replicas": _REPLICAS if arguments.replicas is None else whole(arguments.replicas, "--replicas", 2),
        "rng": None if arguments.seed is None else whole(arguments.seed, "--seed", 0),
    }
