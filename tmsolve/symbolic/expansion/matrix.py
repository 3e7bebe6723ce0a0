"""The lumped transfer matrix as sums of exponentials, with sources: what both kinds of series start from."""

from __future__ import annotations

from collections.abc import Iterator, Mapping, Sequence
from dataclasses import dataclass
from typing import Any

import numpy as np

from ...declare.chain import Chain
from ...errors import NotApplicable
from ...maxplus.graphs import strong_labels
from ...symmetry.refine import class_members, equitable
from ...tabulate.colours import numbers_of_colours
from ...tabulate.symbolic import beta
from ..alphabet import Laurent
from ..colours.matrix import ColourMatrix, colour_matrix, tilted_colour_matrix
from ..jet import Jet
from ..matrix import SymbolicMatrix, symbolic_matrix, tilted_matrix
from ..permutations import numbered
from .functions import FunctionField
from .numbers import NumberField

__all__ = ["Constants", "ExponentialMatrix", "Part", "exponential_matrix", "irrational_weight", "source_parts"]

#: Powers of the sources φ and ψ.
Part = tuple[int, int]


@dataclass(frozen=True, eq=False)
class ExponentialMatrix:
    """A square matrix whose entries are sums of c · exp(Σ exponent · class), to first order in two sources.

    Attributes
    ----------
    classes : tuple of sympy expressions
        Such as β J, or ln w for a weight w.
    units : tuple of Fraction
        All exponents of a class are multiples of its unit.
    size : int
        Number of rows.
    parts : dict
        For each power of the sources the entries that do not vanish, by (row, column).
    """

    classes: tuple[Any, ...]
    units: tuple[Any, ...]
    size: int
    parts: Mapping[Part, Mapping[tuple[int, int], Laurent]]

    def restricted(self, states: Sequence[int]) -> ExponentialMatrix:
        """Return the matrix on some of the states."""
        place = {state: k for k, state in enumerate(states)}
        parts = {
            part: {(place[i], place[j]): entry for (i, j), entry in entries.items() if i in place and j in place}
            for part, entries in self.parts.items()
        }
        return ExponentialMatrix(self.classes, self.units, len(states), parts)

    def terms(self) -> Iterator[tuple[Part, int, int, tuple[Any, ...], Any]]:
        """Yield part, row, column, exponents and coefficient of every exponential."""
        for part, entries in self.parts.items():
            for (i, j), entry in entries.items():
                for exponents, c in entry.items():
                    yield part, i, j, exponents, c


def exponential_matrix(chain: Chain, names: Sequence[str] = ()) -> ExponentialMatrix:
    """Assemble the transfer matrix of a chain, averaged over equivalent states.

    Parameters
    ----------
    chain : Chain
        The chain.
    names : sequence of str
        Up to two observables a, b whose sources multiply the weights by exp(φ a) exp(ψ b).

    Raises
    ------
    NotApplicable
        T is fixed, or an energy depends on it in another way than as −T ln g.
    """
    if "T" in chain.fixed:
        raise NotApplicable("a series in the temperature needs T free; it is fixed in this chain")
    matrix = _assembled(chain, names)
    _check_classes(matrix.alphabet.classes)
    lumped = matrix.entries if isinstance(matrix, ColourMatrix) else _lumped(matrix, len(names))
    size = len(lumped)
    parts: dict[Part, dict[tuple[int, int], Laurent]] = {}
    for i in range(size):
        for j in range(size):
            entry = lumped[i, j]
            elements = entry.parts() if isinstance(entry, Jet) else (entry,)
            for part, element in zip(source_parts(2), elements, strict=False):
                if element:
                    parts.setdefault(part, {})[i, j] = matrix.laurent(element)
    alphabet = matrix.alphabet
    return ExponentialMatrix(alphabet.classes, alphabet.units, size, parts)


def _assembled(chain: Chain, names: Sequence[str]) -> SymbolicMatrix:
    if numbers_of_colours(chain):
        return tilted_colour_matrix(chain, *names) if names else colour_matrix(chain)
    return tilted_matrix(chain, *names) if names else symbolic_matrix(chain)


def source_parts(count: int) -> tuple[Part, ...]:
    """Return the powers of so many sources, the largest last.

    Examples
    --------
    >>> source_parts(1)
    ((0, 0), (1, 0))
    """
    return ((0, 0), (1, 0), (0, 1), (1, 1))[: 2**count]


def _lumped(matrix: SymbolicMatrix, sources: int) -> np.ndarray:
    """Average the matrix over states that counting weights cannot tell apart.

    To first order in a source the classes of the matrix without it are enough, because its
    Perron vectors are constant on them; to second order the classes must be those with the
    sources too. States that do not reach each other stay apart, so that a tie is noticed.
    """
    entries = matrix.entries
    table = numbered(entries if sources != 1 else _values(entries))
    colours = _components(_values(entries)) if sources else None
    classes = class_members(equitable(table, colours))
    domain = matrix.alphabet.ring.domain
    lumped = np.empty((len(classes), len(classes)), dtype=object)
    for a, rows in enumerate(classes):
        for b, columns in enumerate(classes):
            cells = [entries[i, j] for i in rows for j in columns]
            total = sum(cells[1:], cells[0])
            share = domain(len(columns))
            lumped[a, b] = total.over(share) if isinstance(total, Jet) else total.quo_ground(share)
    return lumped


def _values(entries: np.ndarray) -> np.ndarray:
    """Return the entries without sources."""
    values = np.empty(entries.shape, dtype=object)
    for index in np.ndindex(entries.shape):
        entry: Any = entries[index]
        values[index] = entry.x if isinstance(entry, Jet) else entry
    return values


def _components(values: np.ndarray) -> np.ndarray:
    present = [(i, j) for i, j in np.ndindex(values.shape) if values[i, j]]
    rows, cols = np.array(present, dtype=np.intp).reshape(-1, 2).T
    return strong_labels(rows, cols, len(values))


def _check_classes(classes: Sequence[Any]) -> None:
    for key in classes:
        if beta() in (key / beta()).free_symbols and beta() in key.free_symbols:
            raise NotApplicable(
                f"the logarithm of a Boltzmann factor contains {key}, which is not linear in beta = 1/T; a series "
                "takes energies that do not depend on T, apart from -T*log(degeneracy)"
            )


def irrational_weight(number: Any) -> NotApplicable:
    """Return the error for a weight that is no rational number."""
    return NotApplicable(
        f"weights contain the irrational number {number}, and a series starts from rational ones; energies in T of the "
        "form -T*log(g) with rational g are such weights. Use solve(chain.at(…)) for numbers"
    )


class Constants:
    """The symbols other than β in the coefficients of a series, as a polynomial ring over a field.

    Parameters
    ----------
    matrix : ExponentialMatrix
        Its classes ln w make symbols w, its classes β J symbols J.
    field : NumberField
        Numbers of the coefficients. Of a `FunctionField` the symbols w are elements.
    """

    def __init__(self, matrix: ExponentialMatrix, field: NumberField) -> None:
        import sympy as sp
        from sympy.polys.orderings import lex
        from sympy.polys.rings import PolyRing

        self.field = field
        self._matrix = matrix
        self._expressions: list[Any] = []
        self._place: dict[int, int] = {}
        self._rates: dict[int, Any] = {}
        inside = field.powers if isinstance(field, FunctionField) else {}
        self._inside: dict[int, Any] = dict(inside)
        for k, (key, unit) in enumerate(zip(matrix.classes, matrix.units, strict=True)):
            if beta() not in key.free_symbols:
                power = sp.Rational(unit.numerator, unit.denominator)
                new = key.args[0] ** power if isinstance(key, sp.log) else sp.exp(key * power)
            else:
                new = self._rates[k] = key / beta()
            if not new.is_Rational and k not in inside:
                self._place[k] = len(self._expressions)
                self._expressions.append(new)
        names = [sp.Symbol(f"g{k}") for k in range(len(self._expressions))]
        self.ring: Any = PolyRing(names, field.domain, lex) if names else None
        self.zero = self.ring.zero if self.ring is not None else field.domain.zero

    def is_number(self, exponents: Sequence[Any]) -> bool:
        """Whether the constant classes do not occur."""
        return not any(exponent for k, exponent in enumerate(exponents) if k in self._place and k not in self._rates)

    def coefficient(self, exponents: Sequence[Any], c: Any) -> Any:
        """Return c times the constant classes to their powers."""
        number = self.field.number(c)
        powers = [0] * len(self._expressions)
        for k, exponent in enumerate(exponents[: len(self._matrix.classes)]):
            if k in self._rates or not exponent:
                continue
            count = int(exponent / self._matrix.units[k])
            if k in self._inside:
                number = number * self._inside[k] ** count
                continue
            if count < 0:
                raise self._inverse(self._expressions[self._place[k]])
            powers[self._place[k]] = count
        if not any(powers):
            return number if self.ring is None else self.ring.ground_new(number)
        return self.ring.from_dict({tuple(powers): number})

    @staticmethod
    def _inverse(base: Any) -> NotApplicable:
        names = sorted(str(symbol) for symbol in base.free_symbols)
        if not names:
            return irrational_weight(base)
        return NotApplicable(
            f"{base} occurs with a negative power, and the coefficients of a series are polynomials; fix it with "
            f"chain.fix({'=…, '.join(names)}=…)"
        )

    def rate(self, exponents: Sequence[Any]) -> Any:
        """Return Σ exponent · class / β."""
        total = self.zero
        for k, exponent in enumerate(exponents):
            if k not in self._rates or not exponent:
                continue
            if k in self._place:
                total = total + self.ring.gens[self._place[k]] * self.field.number(exponent)
            else:
                number = self._rates[k]
                total = total + self.field.number(exponent * int(number.p) / int(number.q))
        return total

    def number(self, element: Any) -> Any:
        """Return an element as one of the field, or None where it contains symbols."""
        if self.ring is None:
            return element
        return element.coeff(1) if element.is_ground else None

    def expression(self, element: Any) -> Any:
        """Return an element as a sympy expression."""
        import sympy as sp

        if self.ring is None:
            return self.field.expression(element)
        total = []
        for powers, c in element.terms():
            factors = [base**power for base, power in zip(self._expressions, powers, strict=True) if power]
            total.append(sp.Mul(self.field.expression(c), *factors))
        plain = all(base.is_Symbol for base in self._expressions) and self.field.is_rational
        return sp.Add(*total) if plain or self._inside else sp.expand(sp.Add(*total))

    def functions(self) -> FunctionField:
        """Return the field of rational functions of all classes that are free of β."""
        return FunctionField({k: self._expressions[place] for k, place in self._place.items() if k not in self._rates})
