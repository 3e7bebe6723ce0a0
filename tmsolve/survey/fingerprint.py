"""A hash of what a chain means, so that stored results are found again and never mixed up.

Functions enter by their compiled code, constants, defaults and the values they close over
or take from their module; names and line numbers do not count.
"""

from __future__ import annotations

import functools
import hashlib
import types
from collections.abc import Iterator, Mapping
from decimal import Decimal
from fractions import Fraction
from typing import Any

import numpy as np

from .._version import __version__
from ..declare import Chain, Term
from ..errors import ParameterError

__all__ = ["chain_key", "content_key"]

_PLAIN = (int, float, complex, str, bytes, bool, type(None), type(Ellipsis), Fraction, Decimal, range)


def content_key(*parts: Any) -> str:
    """Return the SHA-256 of plain values, arrays and functions, as text.

    Examples
    --------
    >>> content_key(lambda s, J: -J*s) == content_key(lambda s, J: -J*s)
    True
    >>> content_key(lambda s, J: -J*s) == content_key(lambda s, J: -J*s*s)
    False
    """
    digest = hashlib.sha256()
    for piece in _pieces(parts, set()):
        digest.update(len(piece).to_bytes(8, "little") + piece)
    return digest.hexdigest()


def chain_key(chain: Chain) -> str:
    """Return the hash of everything in a chain that its results depend on, fixed values included."""
    cell = {kind: (states.values, states.weights) for kind, states in chain.cell.items()}
    observables = {name: tuple(map(_term, terms)) for name, terms in chain.observables.items()}
    fixed = {**chain.defaults, **chain.fixed}
    return content_key(__version__, cell, tuple(map(_term, chain.terms)), observables, fixed)


def _term(term: Term) -> tuple[Any, ...]:
    return term.role, term.places, term.function


def _pieces(value: Any, seen: set[int]) -> Iterator[bytes]:
    kind = type(value).__name__.encode()
    if isinstance(value, _PLAIN):
        yield kind + b" " + repr(value).encode()
    elif isinstance(value, np.generic):
        yield kind + b" " + repr(value.item()).encode()
    elif isinstance(value, np.ndarray) and value.dtype != object:
        yield b"array " + str((value.dtype.str, value.shape)).encode() + np.ascontiguousarray(value).tobytes()
    elif id(value) in seen:
        yield b"again"
    elif isinstance(value, types.CodeType):
        yield b"code " + value.co_code + repr((value.co_names, value.co_argcount, value.co_varnames)).encode()
        yield from _all(value.co_consts, seen)
    else:
        yield from _compound(value, kind, seen | {id(value)})


def _compound(value: Any, kind: bytes, seen: set[int]) -> Iterator[bytes]:
    if isinstance(value, Mapping):
        yield b"mapping %d" % len(value)
        yield from _all((part for item in value.items() for part in item), seen)
    elif isinstance(value, (tuple, list)):
        yield b"sequence %d" % len(value)
        yield from _all(value, seen)
    elif isinstance(value, (set, frozenset)):
        yield b"set " + repr(sorted(map(repr, value))).encode()
    elif isinstance(value, types.FunctionType):
        yield b"function"
        yield from _function(value, seen)
    elif isinstance(value, functools.partial):
        yield from _all((value.func, value.args, value.keywords), seen)
    elif isinstance(value, (types.ModuleType, types.BuiltinFunctionType, np.ufunc, type)):
        yield kind + b" " + f"{getattr(value, '__module__', '')}.{value.__name__}".encode()
    else:
        raise ParameterError(
            "store= tells results apart by the content of the chain's functions, and one of them uses "
            f"{value!r}, whose content cannot be read; pass it as a parameter or leave out store="
        )


def _all(values: Any, seen: set[int]) -> Iterator[bytes]:
    for value in values:
        yield from _pieces(value, seen)


def _function(function: types.FunctionType, seen: set[int]) -> Iterator[bytes]:
    yield from _pieces(function.__code__, seen)
    yield from _pieces(function.__defaults__, seen)
    yield from _pieces(function.__kwdefaults__, seen)
    yield from _all((cell.cell_contents for cell in function.__closure__ or ()), seen)
    for name in sorted(_names(function.__code__)):
        if name in function.__globals__:
            yield name.encode()
            yield from _pieces(function.__globals__[name], seen)


def _names(code: types.CodeType) -> set[str]:
    inner = (part for part in code.co_consts if isinstance(part, types.CodeType))
    return set(code.co_names).union(*map(_names, inner))
