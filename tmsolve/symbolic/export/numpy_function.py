"""Closed forms as NumPy functions that are right at low temperature, with source that stands alone."""

from __future__ import annotations

import re
from collections.abc import Callable
from typing import TYPE_CHECKING, Any

from ...errors import NotApplicable, ParameterError, SolveError, did_you_mean, listing
from ...tabulate.symbolic import parameter_symbols
from ..deadline import TimeUp, limited
from ..spectrum import leading_class
from .numpy_check import Reference, formula, leading
from .numpy_expressions import expression_lines, python_text
from .numpy_helpers import LEVELS, ROOT, SIGNED
from .numpy_lengths import LENGTHS, length_lines
from .numpy_levels import level_lines

if TYPE_CHECKING:
    from ..closed import ClosedForm

__all__ = ["numpy_function", "numpy_source"]

_SHORT = {
    "f": "free_energy",
    "u": "internal_energy",
    "s": "entropy",
    "c": "specific_heat",
    "xi": "correlation_length",
}
_WORDS = {
    "free_energy": "Free energy per cell, in the unit of energy",
    "internal_energy": "Internal energy per cell, in the unit of energy",
    "entropy": "Entropy per cell, in units of k_B",
    "specific_heat": "Specific heat per cell at fixed parameters, in units of k_B",
    "mean": "Mean of {} per cell",
    "susceptibility": "Susceptibility of {} per cell, in 1/energy",
    "correlation_length": "Correlation length in cells",
}
#: What the levels of the Perron root give.
_FROM_LEVELS = {
    "free_energy": "-level[0] / beta",
    "internal_energy": "-level[1]",
    "entropy": "level[3]",
    "specific_heat": "beta**2 * level[2]",
}


def numpy_function(form: ClosedForm, quantity: str, *, solver: Callable[[Any], Any] | None = None) -> Any:
    """Return a quantity of a closed form as a NumPy function of T and the parameters.

    The function works with logarithms, so that it holds at any temperature above 0, and on arrays that
    broadcast. It is compared with the formula in long numbers at random points down to T = 0.01 (in
    units of the couplings) before it is returned.

    Parameters
    ----------
    form : ClosedForm
        Made by `closed_form`.
    quantity : str
        free_energy (f), internal_energy (u), entropy (s), specific_heat (c), mean(m), susceptibility(m),
        susceptibility(m,q) or correlation_length (xi).
    solver : callable, optional
        Takes a point and returns a solution, as `solve` does; the function is then compared with that as well.

    Returns
    -------
    function
        Takes T (unless it is fixed) and the free parameters in their order, by position or name;
        ``function.source`` is its text, which needs NumPy only.

    Raises
    ------
    ParameterError
        An unknown quantity or observable.
    NotApplicable
        There is no formula, or one that NumPy cannot compute.
    SolveError
        The function would not have all its digits at some temperature.

    Examples
    --------
    >>> from tmsolve import Chain, bond, closed_form, ising
    >>> form = closed_form(Chain(ising(), [bond(lambda s, t, J: -J*s*t)]))
    >>> c = numpy_function(form, "specific_heat")
    >>> c(T=[1.0, 0.01], J=1.0)
    array([4.19974342e-01, 5.53558611e-83])
    """
    name, observables = _parse(form, quantity)
    try:
        return limited(form.time_limit, _made, form, name, observables, solver)
    except TimeUp:
        raise SolveError(
            f"the NumPy function of {name} was not written and compared within {form.time_limit:g} s; derive the "
            "form with a longer time_limit, or use solve(chain.at(…)) for numbers"
        ) from None


def _made(form: ClosedForm, name: str, observables: tuple[str, ...], solver: Callable[[Any], Any] | None) -> Any:
    reference = Reference(form, name, observables)
    source = _source(form, name, observables)
    space: dict[str, Any] = {}
    exec(compile(source, f"<exported {name}>", "exec"), space)
    function = space[name]
    function.source = source
    reference.compare(function, _arguments(form), solver)
    return function


def numpy_source(form: ClosedForm, quantity: str) -> str:
    """Return the text of `numpy_function`, which can be pasted into a script: it imports NumPy only."""
    text: str = numpy_function(form, quantity).source
    return text


def _parse(form: ClosedForm, quantity: Any) -> tuple[str, tuple[str, ...]]:
    match = re.fullmatch(r"\s*(\w+)\s*(?:\(\s*(\w+)\s*(?:,\s*(\w+)\s*)?\))?\s*", str(quantity))
    name = _SHORT.get(match.group(1), match.group(1)) if match else str(quantity)
    observables = tuple(x for x in match.groups()[1:] if x) if match else ()
    allowed = {"mean": (1,), "susceptibility": (1, 2)}.get(name, (0,))
    if match is None or name not in _WORDS or len(observables) not in allowed:
        known = [f"{word}(m)" if word in ("mean", "susceptibility") else word for word in _WORDS]
        raise ParameterError(
            f"no NumPy function of {quantity!r}; there are {listing(known)} and {listing(_SHORT)}."
            f"{did_you_mean(name, _WORDS)}"
        )
    for observable in observables:
        form.chain.observable(observable)
    return name, observables


def _source(form: ClosedForm, name: str, observables: tuple[str, ...]) -> str:
    chain = form.chain
    body, helpers = _body(form, name, observables)
    arguments = _arguments(form)
    clash = [argument for argument in arguments if argument.startswith("_") or argument in ("numpy", "level", "result")]
    if clash:
        raise NotApplicable(f"a parameter called {clash[0]!r} has another meaning in a NumPy function; rename it")
    words = _WORDS[name].format(" and ".join(observables))
    # The name of a chain is anything; as text within quotes it must stay text.
    title = " ".join(chain.name.replace("\\", "/").replace('"', "'").split())
    head = [f"def {name}({', '.join(arguments)}):", f'    """{words}: {title}."""']
    if "T" in arguments:
        head += [
            "    if numpy.any(numpy.asarray(T) <= 0.0):",
            '        raise ValueError("T must be a temperature above 0")',
            "    beta = 1.0 / numpy.asarray(T, dtype=float)",
        ]
    else:
        head.append(f"    beta = {python_text(1 / parameter_symbols(chain)['T'])}")
    spread = ", ".join(f"numpy.asarray({argument}, dtype=float)" for argument in arguments if argument != "T")
    names = ", ".join(argument for argument in arguments if argument != "T")
    if names:
        comma = "," if "," not in names else ""
        head.append(f"    {names}{comma} = {spread}{comma}")
    if arguments:
        # Quantities that do not depend on some argument have its shape all the same.
        shapes = ", ".join(f"numpy.shape({argument})" for argument in arguments)
        body = [*body[:-1], f"{body[-1]} + numpy.zeros(numpy.broadcast_shapes({shapes}))"]
    text = "import numpy\n\n" + helpers.rstrip() + "\n\n\n" + "\n".join([*head, *(f"    {line}" for line in body)])
    return text + "\n"


def _body(form: ClosedForm, name: str, observables: tuple[str, ...]) -> tuple[list[str], str]:
    """Return the lines that compute a quantity, and the helpers they call."""
    if name in _FROM_LEVELS:
        lines = level_lines(form.spectrum, leading(form), python_text)
        if lines is not None:
            root = ROOT if any("_larger_root(" in line for line in lines) else ""
            return [*lines, f"return {_FROM_LEVELS[name]}"], LEVELS + root
    if name == "correlation_length":
        lines = length_lines(leading_class(form.spectrum, leading(form)), leading(form), python_text)
        if lines is not None:
            return [*lines, "return result"], SIGNED + LENGTHS
    return [*expression_lines(formula(form, name, observables)), "return result"], SIGNED


def _arguments(form: ClosedForm) -> list[str]:
    chain = form.chain
    numbers = dict.fromkeys(states.number for states in chain.cell.values() if states.number is not None)
    return [*([] if "T" in chain.fixed else ["T"]), *chain.free, *filter(None, numbers)]
