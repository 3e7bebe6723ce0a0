"""The model of a command line, and where each of its parameters gets its value."""

from __future__ import annotations

import argparse
from collections.abc import Collection, Iterable, Mapping
from dataclasses import dataclass
from fractions import Fraction
from pathlib import Path
from typing import TYPE_CHECKING, Any

from ..errors import DeclarationError, ParameterError, did_you_mean, listing
from .outcome import UsageError
from .table import show_exact
from .words import assignments, exact

if TYPE_CHECKING:
    from ..models import LoadedModel
    from ..observe.readings import Reading

__all__ = ["Values", "check_names", "fill", "given_values", "load_model", "readings_of"]


def load_model(arguments: argparse.Namespace) -> LoadedModel:
    """Load MODEL with its options.

    Raises
    ------
    UsageError
        There is no such model, its file does not run, or it does not take the options.
    """
    from ..models._load import load

    options = assignments(arguments.option, "--option", "q=5")
    try:
        return load(arguments.model, **options)
    except DeclarationError as error:
        raise UsageError(f"{error}{_near_file(arguments.model)}") from error


def _near_file(text: str) -> str:
    path = Path(text).expanduser()
    if path.exists() or not (text.endswith(".py") or path.name != text) or not path.parent.is_dir():
        return ""
    return did_you_mean(path.name, sorted(file.name for file in path.parent.glob("*.py")))


@dataclass(frozen=True)
class Values:
    """Exact values of parameters and where they come from.

    Attributes
    ----------
    numbers : mapping of str to Fraction
        What is to be bound.
    defaulted : tuple of str
        Names whose value is the model's default.
    fixed : mapping of str to number
        What the model itself has fixed.
    """

    numbers: Mapping[str, Any]
    defaulted: tuple[str, ...]
    fixed: Mapping[str, Any]

    @property
    def all(self) -> dict[str, Any]:
        """Every value, fixed ones included."""
        return {**self.fixed, **self.numbers}

    def lines(self) -> list[str]:
        """Return ``NAME = VALUE`` for people, with the origin of what was not given."""
        origin = {
            **dict.fromkeys(self.fixed, "  (fixed by the model)"),
            **dict.fromkeys(self.defaulted, "  (default)"),
        }
        return [f"{name} = {show_exact(value)}{origin.get(name, '')}" for name, value in self.all.items()]

    def remark(self) -> str:
        """Return one sentence on the defaults taken, or an empty string."""
        taken = listing(f"{name} = {show_exact(self.numbers[name])}" for name in self.defaulted)
        return f"from the model's defaults: {taken}" if self.defaulted else ""

    def document(self) -> dict[str, Any]:
        """Return the values for JSON: as numbers, exactly as text, and which are defaults."""
        return {
            "parameters": self.all,
            "exact": {name: str(value) for name, value in self.all.items()},
            "defaults_used": list(self.defaulted),
        }


def given_values(arguments: argparse.Namespace, model: LoadedModel) -> dict[str, Fraction]:
    """Return what -p gives, as exact numbers of known parameters.

    Raises
    ------
    UsageError
        Malformed, unknown or fixed by the model.
    """
    texts = assignments(arguments.parameter, "-p", "J=1")
    check_names(texts, model, "-p")
    return {name: exact(text, f"-p {name}") for name, text in texts.items()}


def check_names(names: Iterable[str], model: LoadedModel, option: str) -> None:
    """Refuse names that are no parameter of the model, or that the model has fixed."""
    known = [*model.chain.parameters, "T"]
    for name in names:
        if name in model.chain.fixed:
            value = show_exact(model.chain.fixed[name])
            raise UsageError(f"{option} {name}: the model itself fixes {name} at {value}; leave it out")
        if name not in known:
            raise UsageError(
                f"{option} {name}: no parameter {name!r}; model {model.name} has {listing(known)}."
                f"{_option_hint(name, model) or did_you_mean(name, known)}"
            )


def _option_hint(name: str, model: LoadedModel) -> str:
    return f" {name!r} is an option of the model: --option {name}=…" if name in model.options else ""


def readings_of(names: Iterable[str], model: LoadedModel) -> list[Reading]:
    """Return readings by name.

    Raises
    ------
    UsageError
        Unknown quantity or observable.
    """
    from ..observe.readings import parse_reading

    readings = []
    for name in names:
        try:
            readings.append(parse_reading(name, model.chain))
        except ParameterError as error:
            hint = f" {name!r} is an observable: mean({name})" if name in model.chain.observables else ""
            raise UsageError(f"--read {name}: {error}{hint}") from error
    return readings


def fill(given: Mapping[str, Fraction], model: LoadedModel, running: Collection[str] = ()) -> Values:
    """Add the model's defaults to what was given; parameters that run over values are left out.

    Raises
    ------
    UsageError
        A parameter without a value, a default that is no number.
    """
    defaults = {**model.chain.defaults, **model.defaults}
    numbers: dict[str, Fraction | float] = {}
    missing, taken = [], []
    for name in (*model.chain.parameters, "T"):
        if name in running or name in model.chain.fixed:
            continue
        if name in given:
            numbers[name] = given[name]
        elif name in defaults:
            numbers[name] = _default(name, defaults[name], model)
            taken.append(name)
        else:
            missing.append(name)
    if missing:
        raise UsageError(
            f"no value for {listing(missing)}, and model {model.name} has no default for it; "
            f"give {' '.join(f'-p {name}=…' for name in missing)}"
        )
    return Values(numbers, tuple(taken), dict(model.chain.fixed))


def _default(name: str, value: Any, model: LoadedModel) -> Any:
    from ..declare.values import parse_value

    try:
        number = parse_value(name, value)
    except ParameterError as error:
        raise UsageError(f"DEFAULTS of {model.source}: {error}") from error
    if hasattr(number, "shape"):
        raise UsageError(f"DEFAULTS of {model.source}: {name!r} must be one number, got {value!r}")
    return number
