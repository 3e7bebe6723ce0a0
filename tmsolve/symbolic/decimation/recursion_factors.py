"""Sums of exponentials as products of factors without a common divisor.

Logarithms of polynomials that are pairwise without a common divisor are independent, whether or
not they factor further. Small ones are factored, because that reads better; large ones are taken
whole, and divided by what they share with others only where it matters.
"""

from __future__ import annotations

from collections.abc import Iterable
from dataclasses import dataclass
from fractions import Fraction
from typing import Any

from ..alphabet import Alphabet, Laurent, common_measure
from ..polynomials import factorable
from ..readable import Vector

__all__ = ["Factored", "Key", "factor_all"]

#: Highest power and dense size of what is factored.
_POWER, _SIZE = 60, 4_000

#: A sum of exponentials, centred, as a hashable.
Key = frozenset[tuple[Vector, Fraction]]


@dataclass(frozen=True)
class Factored:
    """A sum of exponentials: number · monomial · Π factor^exponent."""

    number: Fraction
    monomial: Vector
    factors: tuple[tuple[Key, int], ...]


def factor_all(alphabet: Alphabet, sums: Iterable[Laurent], split: bool = False) -> tuple[dict[Key, Factored], bool]:
    """Write sums as products.

    Parameters
    ----------
    alphabet : Alphabet
        Gives the ring.
    sums : iterable of Laurent
        All of them.
    split : bool
        Whether large ones are divided by what they share with others.

    Returns
    -------
    factored : dict
        By the sum, as a frozenset of its items.
    independent : bool
        Whether the factors are known to have no common divisors.
    """
    products: dict[Key, tuple[Fraction, Vector, list[tuple[Any, int]]]] = {}
    whole = False
    for laurent in sums:
        key = frozenset(laurent.items())
        if key not in products:
            lowest, element = _element(alphabet, laurent)
            if factorable(element, _POWER, _SIZE):
                front, found = element.factor_list()
                products[key] = Fraction(int(front.numerator), int(front.denominator)), lowest, found
            else:
                whole = True
                products[key] = Fraction(1), lowest, [(element, 1)]
    if split and whole:
        base = _coprime([element for *_, found in products.values() for element, _ in found])
        products = {key: (n, low, _over(base, found)) for key, (n, low, found) in products.items()}
    return {key: _centred(alphabet, *product) for key, product in products.items()}, split or not whole


def _element(alphabet: Alphabet, laurent: Laurent) -> tuple[Vector, Any]:
    lowest = tuple(map(min, zip(*laurent, strict=True)))
    content = {
        tuple(int((e - low) / unit) for e, low, unit in zip(x, lowest, alphabet.units, strict=False)) or (0,): (
            alphabet.ring.domain(c.numerator, c.denominator)
        )
        for x, c in laurent.items()
    }
    return lowest, alphabet.ring.from_dict(content)


def _coprime(elements: list[Any]) -> list[Any]:
    """Return polynomials without common divisors of which all given ones are products, up to numbers."""
    base: list[Any] = []
    waiting = [element.monic() for element in elements]
    while waiting:
        new = waiting.pop()
        if new.is_ground:
            continue
        for k, old in enumerate(base):
            shared = old.gcd(new).monic()
            if not shared.is_ground:
                del base[k]
                parts = [shared, old.exquo(shared).monic(), new.exquo(shared).monic()]
                if shared == old == new:
                    parts = [shared]
                waiting += [part for part in parts if not part.is_ground]
                break
        else:
            base.append(new)
    return base


def _over(base: list[Any], found: list[tuple[Any, int]]) -> list[tuple[Any, int]]:
    exponents: dict[int, int] = {}
    number = None
    for element, times in found:
        rest = element
        for k, factor in enumerate(base):
            while True:
                quotient, remainder = rest.div(factor)
                if remainder:
                    break
                rest, exponents[k] = quotient, exponents.get(k, 0) + times
        number = rest**times if number is None else number * rest**times
    front = [] if number is None else [(number, 1)]
    return front + [(base[k], times) for k, times in exponents.items()]


def _centred(alphabet: Alphabet, number: Fraction, monomial: Vector, found: list[tuple[Any, int]]) -> Factored:
    factors: list[tuple[Key, int]] = []
    for element, times in found:
        factor = alphabet.laurent(element, (0,) * alphabet.width)
        measure = common_measure(factor.values())
        number *= measure**times
        factor = {x: c / measure for x, c in factor.items()}
        middle = _middle(alphabet, factor)
        monomial = tuple(m + times * e for m, e in zip(monomial, middle, strict=False))
        centred = {tuple(e - m for e, m in zip(x, middle, strict=True)): c for x, c in factor.items()}
        if len(centred) > 1:
            factors.append((frozenset(centred.items()), times))
        else:
            # A factor that is a single power of a weight.
            ((x, c),) = centred.items()
            number *= c**times
            monomial = tuple(m + times * e for m, e in zip(monomial, x, strict=False))
    return Factored(number, monomial, tuple(factors))


def _middle(alphabet: Alphabet, factor: Laurent) -> Vector:
    """Return the centre of a sum in those classes in which it reads the same from both ends, else nothing."""
    import sympy as sp

    spans = [(min(x), max(x)) for x in zip(*factor, strict=True)]
    # Powers of a weight are no exponentials: nothing is gained by centring them.
    every = [k for k, key in enumerate(alphabet.classes) if not isinstance(key, sp.log)]
    middle = [Fraction(0)] * len(spans)
    for chosen in ([every] if len(every) > 1 else []) + [[k] for k in every]:
        trial = {k: (spans[k][0] + spans[k][1]) / 2 for k in chosen}
        mirrored = {tuple(2 * trial[k] - e if k in trial else e for k, e in enumerate(x)): c for x, c in factor.items()}
        if mirrored == factor:
            for k in chosen:
                middle[k] = trial[k]
    return tuple(middle)
