"""Writing polynomials in Boltzmann factors the way a person would.

The same sum can be written in exponentials, with hyperbolic functions, as a product, or
collected by one of its exponentials. Each way is drafted by rules, and the shortest is kept;
nothing is simplified by search, so that long results cost little.
"""

from __future__ import annotations

from collections.abc import Callable, Iterable
from fractions import Fraction
from typing import Any

from .alphabet import Alphabet, Laurent, common_measure
from .formula import Draft, atom, call, distinct_total, number, power, product, rational, total
from .polynomials import factorable

__all__ = ["Vector", "Writer", "shifted", "times"]

#: Longer sums are not collected any more, and still longer ones only written term by term.
_COLLECTED_TERMS, _FACTORED_TERMS = 24, 40

#: Highest power and size in dense form of what is factored to be written; longer products are rarely found.
_FACTORED_POWER, _FACTORED_SIZE = 40, 1_500

#: Exponents of the classes.
Vector = tuple[Fraction, ...]


class Writer:
    """Turns sums of exponentials over one alphabet into readable expressions.

    Parameters
    ----------
    alphabet : Alphabet
        Gives the classes (β J, β D, …) that exponents count.
    """

    def __init__(self, alphabet: Alphabet) -> None:
        import sympy as sp

        self.alphabet = alphabet
        #: Powers of a weight w are no exponentials: nothing hyperbolic is written with ln w.
        self._proper = tuple(not isinstance(key, sp.log) for key in alphabet.classes)
        self._atoms = [atom(key if proper else key.args[0]) for key, proper in self._pairs_of_classes()]
        shared = sp.Symbol("beta", positive=True)
        self._over_beta = [key / shared if shared in sp.Mul.make_args(key) else None for key in alphabet.classes]
        self._known: dict[frozenset[tuple[Vector, Fraction]], Draft] = {}
        self._arguments: dict[Vector, Draft] = {}
        #: Roots of quadratics that were written already; finding the best form takes long.
        self.quadratics: dict[Any, Any] = {}
        self._factors: dict[frozenset[tuple[Vector, Fraction]], tuple[Fraction, list[tuple[Laurent, int]]]] = {}

    def _pairs_of_classes(self) -> Iterable[tuple[Any, bool]]:
        return zip(self.alphabet.classes, self._proper, strict=True)

    def write(self, laurent: Laurent) -> Any:
        """Return the shortest of the forms of a sum."""
        return self.draft(laurent).build()

    def draft(self, laurent: Laurent, quick: bool = False) -> Draft:
        """Return the shortest of the drafts of a sum; ``quick`` leaves out the forms that take long to find."""
        terms = {exponents: c for exponents, c in laurent.items() if c}
        key = frozenset(terms.items())
        if key not in self._known:
            if quick:
                return shortest([self.plain(terms), self._paired(terms) if len(terms) <= _FACTORED_TERMS else None])
            # Held while the forms are drafted, in case a form asks for the same sum again.
            self._known[key] = self.plain(terms)
            self._known[key] = shortest([form(terms) for form in self._forms(len(terms))])
        return self._known[key]

    def _forms(self, length: int) -> tuple[Callable[[Laurent], Draft | None], ...]:
        if length < 2 or length > _FACTORED_TERMS:
            return (self.plain,)
        if length > _COLLECTED_TERMS:
            return self.plain, self._paired, self._factored
        return self.plain, self._paired, self._collected, self._factored

    def monomial(self, exponents: Vector, c: Fraction = Fraction(1)) -> Draft:
        """Return c · exp(Σ exponents · classes)."""
        parts = [number(c)]
        for base, exponent, proper in zip(self._atoms, exponents, self._proper, strict=False):
            if exponent and not proper:
                parts.append(_rational_power(base, exponent))
        if any(exponent for exponent, proper in zip(exponents, self._proper, strict=False) if proper):
            parts.append(call("exp", self.argument(exponents)))
        return product(parts)

    def argument(self, exponents: Vector) -> Draft:
        """Return Σ exponents · classes over the proper exponentials, with β and numbers in front."""
        if exponents not in self._arguments:
            used = [
                (base, exponent)
                for base, exponent, proper in zip(self._atoms, exponents, self._proper, strict=False)
                if proper and exponent
            ]
            content = common_measure(exponent for _, exponent in used)
            numbers = sum(abs(exponent) != content for _, exponent in used)
            # A denominator is harder on the eye than a factor.
            numbers += (content.numerator != 1) + 2 * (content.denominator != 1)
            operations = sum(base.operations for base, _ in used) + len(used) - 1 + numbers
            letters = sum(base.letters for base, _ in used) + 3 * (len(used) - 1) + 2 * numbers + (used[0][1] < 0)
            self._arguments[exponents] = Draft(operations, letters, lambda: self._argument(exponents, content))
        return self._arguments[exponents]

    def _argument(self, exponents: Vector, content: Fraction) -> Any:
        import sympy as sp

        used = [(k, exponent) for k, exponent in enumerate(exponents) if self._proper[k] and exponent]
        if all(exponent < 0 for _, exponent in used):
            content = -content
        classes = self.alphabet.classes
        if len(used) == 1:
            return rational(content) * classes[used[0][0]]
        if any(self._over_beta[k] is None for k, _ in used):
            return sp.factor_terms(sp.Add(*(rational(exponent) * classes[k] for k, exponent in used)))
        inside = sp.Add(*(rational(exponent / content) * self._over_beta[k] for k, exponent in used))
        return sp.Mul(rational(content), sp.Symbol("beta", positive=True), inside)

    def plain(self, terms: Laurent) -> Draft:
        """Write exponentials as they come."""
        parts = [self.monomial(exponents, c) for exponents, c in terms.items()]
        return distinct_total(parts) if len(parts) > _FACTORED_TERMS else total(parts)

    def _paired(self, terms: Laurent) -> Draft | None:
        """Write exp(a + b) ± exp(a − b) as 2 exp(a) cosh(b) or sinh(b), simplest a first."""
        rest = dict(terms)
        groups: dict[Vector, list[Draft]] = {}
        for _, middle, half, u, v in sorted(self._pairs(terms)):
            if u not in rest or v not in rest:
                continue
            c, d = rest.pop(u), rest.pop(v)
            function = call("cosh" if c == d else "sinh", self.argument(half))
            groups.setdefault(middle, []).append(product([number(2 * c), function]))
        if not groups:
            return None
        for exponents, c in rest.items():
            groups.setdefault(exponents, []).append(number(c))
        return total(product([self.monomial(middle), total(parts)]) for middle, parts in groups.items())

    def _pairs(self, terms: Laurent) -> list[tuple[tuple, Vector, Vector, Vector, Vector]]:
        ordered = sorted(terms, reverse=True)
        pairs = []
        for i, u in enumerate(ordered):
            for v in ordered[i + 1 :]:
                if abs(terms[u]) != abs(terms[v]):
                    continue
                half = tuple((a - b) / 2 for a, b in zip(u, v, strict=True))
                if all(proper or not h for h, proper in zip(half, self._proper, strict=True)):
                    middle = tuple((a + b) / 2 for a, b in zip(u, v, strict=True))
                    pairs.append(((_weight(middle), _weight(half)), middle, half, u, v))
        return pairs

    def _collected(self, terms: Laurent) -> Draft | None:
        """Write as a sum over the powers of one class, each with its own coefficient."""
        drafts = []
        for k in range(len(self.alphabet.classes)):
            by_power: dict[Fraction, Laurent] = {}
            for exponents, c in terms.items():
                rest = (*exponents[:k], Fraction(0), *exponents[k + 1 :])
                by_power.setdefault(exponents[k], {})[rest] = c
            if 1 < len(by_power) < len(terms):
                drafts.append(self._by_powers(k, by_power))
        return shortest(drafts) if drafts else None

    def _by_powers(self, k: int, by_power: dict[Fraction, Laurent]) -> Draft:
        parts = []
        for exponent, coefficient in by_power.items():
            opposite = by_power.get(-exponent)
            same = _same(coefficient, opposite) if opposite is not None else 0
            unit = tuple(abs(exponent) if i == k else Fraction(0) for i in range(len(self.alphabet.classes)))
            if exponent and self._proper[k] and same:
                if exponent > 0:
                    function = call("cosh" if same == 1 else "sinh", self.argument(unit))
                    parts.append(product([function, self.draft(times(coefficient, Fraction(2)))]))
            else:
                here = tuple(exponent if i == k else Fraction(0) for i in range(len(self.alphabet.classes)))
                # -(a + b) exp(x) and not (-a - b) exp(x).
                sign = Fraction(-1 if exponent and max(coefficient.values()) < 0 else 1)
                parts.append(product([self.monomial(here, sign), self.draft(times(coefficient, sign))]))
        return total(parts)

    def _factored(self, terms: Laurent) -> Draft | None:
        """Write as a product of powers, each factor centred where that is shorter."""
        c, lowest, factors = self.factor(terms)
        if len(factors) == 1 and factors[0][1] == 1 and not any(lowest) and c == 1:
            return self._moved(terms)
        return shortest([self._product(c, lowest, factors, centre) for centre in (self._if_shorter, self._middle)])

    def _moved(self, terms: Laurent) -> Draft | None:
        middle = self._middle(terms)
        return product([self.monomial(middle), self.draft(shifted(terms, middle, -1))]) if any(middle) else None

    def _product(self, c: Fraction, lowest: Vector, factors: Any, centre: Callable[[Laurent], Vector]) -> Draft:
        monomial, parts = lowest, []
        for factor, exponent in factors:
            middle = centre(factor)
            monomial = tuple(a + exponent * m for a, m in zip(monomial, middle, strict=True))
            # Powers of two go with hyperbolic functions: 4 sinh², not (2 sinh)².
            inner = self.draft(shifted(factor, middle, -1))
            half = self.draft(times(shifted(factor, middle, -1), Fraction(1, 2)))
            if exponent > 1 and half.cost < inner.cost:
                c, inner = c * 2**exponent, half
            parts.append(power(inner, exponent))
        return product([self.monomial(monomial, c), *parts])

    def _if_shorter(self, factor: Laurent) -> Vector:
        middle = self._middle(factor)
        centred = product([self.monomial(middle), self.draft(shifted(factor, middle, -1))])
        return middle if centred.cost < self.draft(factor).cost else tuple(Fraction(0) for _ in middle)

    def factor(self, terms: Laurent) -> tuple[Fraction, Vector, list[tuple[Laurent, int]]]:
        """Return number, monomial and irreducible factors with their powers; a large sum is taken as one factor."""
        lowest = tuple(map(min, zip(*terms, strict=True)))
        content = common_measure(terms.values())
        if terms[max(terms)] < 0:
            content = -content
        primitive = times(shifted(terms, lowest, -1), 1 / content)
        key = frozenset(primitive.items())
        if key not in self._factors:
            self._factors[key] = self._factor_list(primitive)
        number_, factors = self._factors[key]
        return content * number_, lowest, factors

    def _factor_list(self, primitive: Laurent) -> tuple[Fraction, list[tuple[Laurent, int]]]:
        alphabet = self.alphabet
        content = {
            tuple(int(e / unit) for e, unit in zip(x, alphabet.units, strict=True)) or (0,): alphabet.ring.domain(
                c.numerator, c.denominator
            )
            for x, c in primitive.items()
        }
        element = alphabet.ring.from_dict(content)
        if not factorable(element, _FACTORED_POWER, _FACTORED_SIZE):
            return Fraction(1), [(primitive, 1)]
        front, found = element.factor_list()
        factors = [(alphabet.laurent(factor, (0,) * alphabet.width), exponent) for factor, exponent in found]
        return Fraction(int(front.numerator), int(front.denominator)), factors

    def _middle(self, laurent: Laurent) -> Vector:
        """Return the centre of a factor that reads the same (up to sign) from both ends, else zero."""
        spans = [(min(x), max(x)) for x in zip(*laurent, strict=True)]
        middle = tuple((low + high) / 2 for low, high in spans)
        mirrored = {tuple(2 * m - e for e, m in zip(x, middle, strict=True)): c for x, c in laurent.items()}
        symmetric = len(laurent) > 1 and _same(laurent, mirrored)
        whole = all(m == 0 or proper for m, proper in zip(middle, self._proper, strict=True))
        return middle if symmetric and whole else tuple(Fraction(0) for _ in middle)


def shortest(drafts: Iterable[Draft | None]) -> Draft:
    """Return the draft that is easiest to read."""
    return min((draft for draft in drafts if draft is not None), key=lambda draft: draft.cost)


def shifted(laurent: Laurent, by: Vector, sign: int = 1) -> Laurent:
    """Return a sum times the monomial of ``sign * by``."""
    return {tuple(e + sign * m for e, m in zip(x, by, strict=True)): c for x, c in laurent.items()}


def times(laurent: Laurent, by: Fraction) -> Laurent:
    """Return a sum times a number."""
    return {x: c * by for x, c in laurent.items()}


def _same(a: Laurent, b: Laurent) -> int:
    """Return 1 when equal, −1 when opposite, else 0."""
    if a == b:
        return 1
    return -1 if a.keys() == b.keys() and all(a[x] == -b[x] for x in a) else 0


def _weight(vector: Vector) -> tuple[int, Fraction]:
    return sum(1 for x in vector if x), sum((abs(x) for x in vector), Fraction(0))


def _rational_power(base: Draft, exponent: Fraction) -> Draft:
    return base if exponent == 1 else atom(base.build() ** rational(exponent))
