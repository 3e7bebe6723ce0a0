"""Tables of a term in exact symbols: the user's function at every combination of local states.

States enter as sympy numbers, free parameters as symbols of the same name, fixed ones as
exact rationals, and ``T`` as 1/beta. Each table is compared with what the same function
returns for ordinary floats, so that a function that treats symbols differently is found.
"""

from __future__ import annotations

import itertools
import math
from collections.abc import Mapping
from fractions import Fraction
from typing import TYPE_CHECKING, Any

from ..declare.inexact import require_discrete
from ..declare.tokens import Colour, ColourMisuse
from ..errors import DeclarationError
from .tracer import Inexact, NotSymbolic, Tracer, unwrap

if TYPE_CHECKING:
    import numpy as np

    from ..declare.chain import Chain
    from ..declare.terms import Term

__all__ = ["beta", "parameter_symbols", "symbolic_table"]

#: Relative agreement asked of a symbolic and a floating-point value of one function.
_AGREEMENT = 1e-9
#: Names that closed forms use for themselves.
_RESERVED = {"beta": "the inverse temperature 1/T", "N": "the number of cells"}


def beta() -> Any:
    """Return the inverse temperature β = 1/T as a positive symbol."""
    import sympy as sp

    return sp.Symbol("beta", positive=True)


def parameter_symbols(chain: Chain) -> dict[str, Any]:
    """Return every parameter, and ``"T"``, as an exact sympy expression.

    Free parameters are real symbols of the same name, fixed ones rationals; T is 1/β.

    Raises
    ------
    DeclarationError
        A free parameter has a name that closed forms need, or a fixed value is not finite.
    NotApplicable
        The states are nodes of a quadrature rule.
    """
    import sympy as sp

    require_discrete(chain.cell, "a closed form")
    symbols: dict[str, Any] = {}
    for name in chain.parameters:
        if name in chain.fixed:
            symbols[name] = _fixed(name, chain.fixed[name])
        elif name in _RESERVED:
            raise DeclarationError(
                f"a parameter called {name!r} cannot be told from {_RESERVED[name]} in a closed form; "
                f"rename it in the energy functions, or fix it: chain.fix({name}=…)"
            )
        else:
            symbols[name] = sp.Symbol(name, real=True)
    symbols["T"] = _fixed("T", chain.fixed["T"]) if "T" in chain.fixed else 1 / beta()
    return symbols


def _fixed(name: str, value: Any) -> Any:
    import sympy as sp

    if not isinstance(value, Fraction):
        raise DeclarationError(
            f"parameter {name!r} is fixed at {value!r}, which is not an exact number; a closed form needs a finite one"
        )
    return sp.Rational(value.numerator, value.denominator)


def symbolic_table(chain: Chain, term: Term, symbols: Mapping[str, Any]) -> np.ndarray:
    """Tabulate a term exactly over the states of its own sites.

    Parameters
    ----------
    chain : Chain
        Where the term's kinds of site are declared.
    term : Term
        An energy, weight or observable of the chain.
    symbols : mapping of str to sympy expression
        From `parameter_symbols`.

    Returns
    -------
    ndarray of object
        One axis per place of the term; sympy expressions, ``oo`` where an energy forbids.

    Raises
    ------
    DeclarationError
        The function branches on a free parameter, is not exact, or raises.
    """
    states = [chain.cell[kind].values for kind, _ in term.places if kind is not None]
    reference = _numeric(term, states, symbols)
    failure: DeclarationError | None = None
    for convert in (_as_sympy, _as_fraction, _as_tracer):
        # A state of 1/2 is a sympy number that differs from the float 0.5; functions that
        # compare it with decimals work with Fractions, and those that call NumPy with tracers.
        try:
            table = _table(term, states, symbols, convert)
        except DeclarationError as error:
            failure = failure or error
            continue
        if _agree(table, reference, symbols):
            return table
    if failure is not None:
        raise failure
    raise DeclarationError(
        f"{term.name} gives other values for exact states and symbols than for floats; "
        "compare states with whole numbers or Fractions, and do not test the types of arguments"
    )


def _as_sympy(state: Any) -> Any:
    import sympy as sp

    if isinstance(state, tuple):
        return tuple(_as_sympy(part) for part in state)
    return state if isinstance(state, (str, Colour)) else sp.Rational(Fraction(state))


def _as_fraction(state: Any) -> Any:
    return state


def _as_tracer(state: Any) -> Any:
    if isinstance(state, tuple):
        return tuple(_as_tracer(part) for part in state)
    return state if isinstance(state, (str, Colour)) else Tracer(_as_sympy(state))


def _as_float(state: Any) -> Any:
    if isinstance(state, tuple):
        return tuple(_as_float(part) for part in state)
    return float(state) if isinstance(state, Fraction) else state


def _table(term: Term, states: list, symbols: Mapping[str, Any], convert: Any) -> np.ndarray:
    import numpy as np

    arguments = {name: Tracer(symbols[name]) for name in term.parameters}
    table = np.empty([len(values) for values in states], dtype=object)
    for index in itertools.product(*(range(len(values)) for values in states)):
        here = [convert(values[i]) for values, i in zip(states, index, strict=True)]
        table[index] = _entry(term, here, arguments)
    return table


def _entry(term: Term, states: list, arguments: dict[str, Any]) -> Any:
    where = f"{term.name} at states ({', '.join(str(state) for state in states)})"
    try:
        returned = term.function(*states, **arguments)
        value = NotImplemented if _is_truth(returned) else unwrap(returned)
    except Inexact as error:
        raise DeclarationError(
            f"{where} uses the float {error.value!r}, which a closed form cannot take as exact; write it as a "
            "Fraction, divide by whole numbers (J/3), or use cos_turns(n, q) for cos(2*pi*n/q)"
        ) from error
    except NotSymbolic as error:
        raise DeclarationError(_symbolic_message(where, error)) from error
    except ColourMisuse as error:
        raise DeclarationError(_colour_message(term, states, error)) from error
    except Exception as error:
        if "Colour" in str(error) and any(isinstance(state, Colour) for state in states):
            misuse = ColourMisuse("uses a colour as a number", "compare colours with ==, != or delta(s, t)")
            raise DeclarationError(_colour_message(term, states, misuse.with_traceback(error.__traceback__))) from error
        if "truth value of Relational" in str(error):
            raise DeclarationError(_symbolic_message(where, NotSymbolic("branches on a parameter", ()))) from error
        raise DeclarationError(
            f"{where} cannot be computed with symbols: {type(error).__name__}: {error}; "
            "it must work for any kind of number, or fix its parameters with chain.fix(…)"
        ) from error
    return _checked(where, term.role, value, returned)


def _is_truth(value: Any) -> bool:
    import sympy as sp

    return isinstance(value, bool) or value is sp.true or value is sp.false or type(value).__name__ == "bool"


def _symbolic_message(where: str, error: NotSymbolic) -> str:
    names = ", ".join(error.names) or "a free parameter"
    fix = ", ".join(f"{name}=…" for name in error.names) or "…"
    return (
        f"{where} {error.what} ({names}), but a closed form leaves {names} free; give it a value with "
        f"chain.fix({fix}), or write the function without branches or float functions of it "
        "(sympy.cos, numpy.exp … work)"
    )


def _colour_message(term: Term, states: list, error: ColourMisuse) -> str:
    number = next(state.number for state in states if isinstance(state, Colour))
    trace, line = error.__traceback__, 0
    while trace is not None:
        if trace.tb_frame.f_code is getattr(term.function, "__code__", None):
            line = trace.tb_lineno
        trace = trace.tb_next
    name = getattr(term.function, "__name__", term.name)
    where = f"{name} (line {line})" if line else name
    return (
        f"{where} at states ({', '.join(str(state) for state in states)}) {error.what}; "
        f"the number of colours, {number}, is a symbol, so that a colour has no number: {error.cure}, "
        "or give a number of colours as in colours(3)"
    )


def _checked(where: str, role: str, value: Any, returned: Any) -> Any:
    import sympy as sp

    if value is NotImplemented:
        raise DeclarationError(
            f"{where} returned {returned!r}, which is not a number; return a number, as in -J*(s == t)"
        )
    if isinstance(value, float):
        if role == "energy" and value == math.inf:
            return sp.oo
        raise DeclarationError(
            f"{where} returned {value}; only an energy may be infinite, and only +inf (a forbidden configuration)"
        )
    if value.has(sp.oo, sp.nan, sp.zoo) or value.has(sp.I):
        raise DeclarationError(f"{where} returned {value}; it must be real and finite, or math.inf to forbid")
    return value


def _probe(symbols: Mapping[str, Any]) -> dict[str, float]:
    """Return generic positive values for the free parameters and T, the same at every call."""
    return {
        name: float(value) if value.is_Number else 0.5 + math.sqrt(7 * k + 2) % 1
        for k, (name, value) in enumerate(symbols.items())
    }


def _numeric(term: Term, states: list, symbols: Mapping[str, Any]) -> dict[tuple[int, ...], Any]:
    probe = _probe(symbols)
    arguments = {name: probe[name] for name in term.parameters}
    values: dict[tuple[int, ...], Any] = {}
    for index in itertools.product(*(range(len(v)) for v in states)):
        here = [_as_float(v[i]) for v, i in zip(states, index, strict=True)]
        try:
            values[index] = float(term.function(*here, **arguments))
        except Exception:
            # The symbolic call meets the same fault and words it; a fault of floats alone cannot be compared.
            values[index] = None
    return values


def _agree(table: np.ndarray, reference: Mapping[tuple[int, ...], Any], symbols: Mapping[str, Any]) -> bool:
    probe = _probe(symbols)
    values = {value: probe[name] for name, value in symbols.items() if value.is_Symbol}
    values[beta()] = 1 / probe["T"]
    for index, number in reference.items():
        if number is None:
            continue
        exact = table[index]
        here = math.inf if exact.is_infinite else float(exact.xreplace(values))
        if here != number and not abs(here - number) <= _AGREEMENT * max(1.0, abs(here), abs(number)):
            return False
    return True
