"""Averages over a law with a density: Gauss's rules on pieces between which the density is not smooth.

Pieces are halved until the density is a polynomial on each; where halving does not help, it has a jump or a kink, which
becomes an end of pieces. Next to an end at which it is singular, the rule is one of double exponential decay
in the chance, for which the singularity is harmless.
"""

from __future__ import annotations

from collections.abc import Callable
from dataclasses import dataclass
from functools import cached_property

import numpy as np

from ..errors import DeclarationError

__all__ = ["Counting", "Density", "chance_rule"]

#: Chances of the tails that are left out, the first that has a finite end; chances at which pieces begin.
_TAILS = (1e-24, 1e-18, 1e-14, 1e-10)
_CHANCES, _FAR = (1e-14, 1e-9, 1e-4, 0.02, 0.25, 0.5), 3
#: What a piece may add to the total chance without being smooth.
_NOTHING = 1e-18
#: Points at which a density is compared with a polynomial, and how well it must agree.
_POINTS = 17
_AGREE = 1e-11
#: Halvings after which a piece is not smooth; halvings that find where.
_DEEP, _DEEPEST = 14, 60
#: Ends beyond which a density is wild.
_MOST_ENDS = 300
#: Fewest nodes of a piece and of one next to a singularity, and nodes of the whole law for one more of both.
_FEWEST, _FEWEST_SINGULAR, _STEP = 12, 30, 20
#: Chance of a piece that a few nodes are enough for.
_RARE = 1e-7
#: Most numbers of a discrete law that are summed over.
_MOST_NUMBERS = 2000
#: What densities in doubles are trusted to, and how far the total chance may be from one.
_ROUNDING, _LEAK = 1e-13, 1e-6
#: What a heavy tail may hold, in its chance times where it begins.
_HEAVY = 10.0
#: Where the rule of double exponential decay ends: the weights there are nothing to a double.
_REACH = 3.4

Pieces = tuple[np.ndarray, np.ndarray]


@dataclass(frozen=True, eq=False)
class Density:
    """A law by its density and its quantiles from either end.

    Attributes
    ----------
    density, below, quantile, from_above : callable
        Of arrays: p(x), P(≤ x), the value below which there is a given chance, and above which.
    support : tuple of float
        Ends, possibly infinite.
    """

    density: Callable[[np.ndarray], np.ndarray]
    below: Callable[[np.ndarray], np.ndarray]
    quantile: Callable[[np.ndarray], np.ndarray]
    from_above: Callable[[np.ndarray], np.ndarray]
    support: tuple[float, float]

    def rule(self, count: int) -> tuple[np.ndarray, np.ndarray]:
        """Return nodes and weights, about ``count`` of them, or more where the density asks for them.

        Every piece has more of them at a larger count, so that a finer rule is always a check of a coarser one.
        """
        smooth, singular = self.pieces
        each = -(-count // (len(smooth[0]) + len(singular[0])))
        likely = self._gauss(smooth, _FEWEST)[1].reshape(-1, _FEWEST).sum(axis=1) > _RARE
        many, few = max(each, _FEWEST + count // _STEP), _FEWEST + count // (4 * _STEP)
        found = [self._gauss((smooth[0][x], smooth[1][x]), n) for x, n in ((likely, many), (~likely, few))]
        nodes, weights = (np.concatenate(parts) for parts in zip(*found, strict=True))
        for a, b in zip(*singular, strict=True):
            low, high = (float(self.below(np.array(x))) for x in (a, b))
            most = max(each, _FEWEST_SINGULAR + count // _STEP)
            places, chances = chance_rule(self.quantile, self.from_above, most, low, high)
            nodes, weights = np.append(nodes, np.clip(places, a, b)), np.append(weights, chances)
        return nodes, weights / weights.sum()

    @cached_property
    def leak(self) -> float:
        """Relative doubt about averages: of the total chance, of its values in doubles, of the tails left out."""
        smooth, singular = self.pieces
        total = float(self._gauss(smooth, 2 * _POINTS)[1].sum())
        total += float(sum(np.asarray(self.below(b)) - self.below(a) for a, b in zip(*singular, strict=True)))
        if abs(total - 1) > _LEAK or not np.isfinite(total):
            raise DeclarationError(f"the density of a random parameter integrates to {total:.8g}, not to one")
        spread = float(np.asarray(self.from_above(np.array(0.25))) - np.asarray(self.quantile(np.array(0.25))))
        beyond = sum(abs(end) * chance for end, chance in self._tails)
        return max(abs(total - 1), _ROUNDING) + _HEAVY * beyond / spread

    @cached_property
    def pieces(self) -> tuple[Pieces, Pieces]:
        """Ends of the pieces on which the density is smooth, and of those next to a singularity."""
        ends = self._ends()
        while True:
            smooth, singular, hidden = self._halved(ends)
            fresh = {x for x in hidden if x not in ends}
            if not fresh or len(ends) > _MOST_ENDS:
                return smooth, singular
            ends = np.array(sorted({*ends, *fresh}))

    def _ends(self) -> np.ndarray:
        chances = np.array(_CHANCES)
        first, last = (chances[0 if np.isinf(end) else _FAR :] for end in self.support)
        inner = np.concatenate([self.quantile(first), self.from_above(last)])
        low, high = self._tails
        return np.array(sorted({low[0], high[0], *(float(x) for x in inner if low[0] < x < high[0])}))

    @cached_property
    def _tails(self) -> tuple[tuple[float, float], tuple[float, float]]:
        """Where the law is taken to end at either side, and the chance beyond."""
        found = []
        for end, inverse in zip(self.support, (self.quantile, self.from_above), strict=True):
            known = [(end, 0.0)] if np.isfinite(end) else [(float(inverse(np.array(p))), p) for p in _TAILS]
            finite = [pair for pair in known if np.isfinite(pair[0])]
            if not finite:
                raise DeclarationError("a random parameter has a law whose quantiles are not finite; give another")
            found.append(finite[0])
        return found[0], found[1]

    def _gauss(self, pieces: Pieces, count: int) -> tuple[np.ndarray, np.ndarray]:
        places, weights = np.polynomial.legendre.leggauss(count)
        a, b = (x[:, None] for x in pieces)
        nodes = a + (b - a) * (1 + places) / 2
        return nodes.ravel(), (np.asarray(self.density(nodes)) * weights * (b - a) / 2).ravel()

    def _halved(self, ends: np.ndarray) -> tuple[Pieces, Pieces, list[float]]:
        """Halve pieces until they are smooth; return also where something is hidden inside of one.

        A piece that is not smooth at one of its ends is left whole, and to another rule.
        """
        a, b = ends[:-1], ends[1:]
        done, counts = [], []
        for depth in range(_DEEP + 1):
            rough = ~self._smooth(a, b)
            done.append((a[~rough], b[~rough]))
            a, b = a[rough], b[rough]
            whole = np.searchsorted(ends, (a + b) / 2) - 1
            counts.append(np.bincount(whole, minlength=len(ends) - 1))
            if depth < _DEEP:
                middle = (a + b) / 2
                a, b = np.append(a, middle), np.append(middle, b)
        near = 2.0 ** (1 - _DEEP) * (ends[whole + 1] - ends[whole])
        # Where halving makes ever more rough pieces the density is lost in rounding, as near x = 1 for (1 − x)^-½.
        noisy = counts[-1] > 3 * counts[-4]
        singular = noisy[whole] | (a - ends[whole] < near) | (ends[whole + 1] - b < near)
        hidden = [self._hidden(*piece) for piece in zip(a[~singular], b[~singular], strict=True)]
        left, right = (np.concatenate(sides) for sides in zip(*done, strict=True))
        kept = ~np.isin(np.searchsorted(ends, (left + right) / 2) - 1, whole[singular])
        odd = np.unique(whole[singular])
        return (left[kept], right[kept]), (ends[odd], ends[odd + 1]), hidden

    def _hidden(self, a: float, b: float) -> float:
        """Return where the density is not smooth between two places."""
        for _ in range(_DEEPEST):
            middle = (a + b) / 2
            if not a < middle < b:
                break
            below, above = self._smooth(np.array([a, middle]), np.array([middle, b]))
            if below and above:
                break
            a, b = (middle, b) if below else (a, middle)
        return (a + b) / 2

    def _smooth(self, a: np.ndarray, b: np.ndarray) -> np.ndarray:
        """Whether the density is a polynomial, to rounding, on each of some pieces; their ends are not looked at."""
        angles = np.pi * (np.arange(_POINTS) + 0.5) / _POINTS
        width = (b - a)[:, None]
        values = np.asarray(self.density(a[:, None] + width * (1 - np.cos(angles)) / 2), dtype=np.float64)
        orders = np.arange(_POINTS - 3, _POINTS)
        with np.errstate(invalid="ignore"):
            last = np.abs(values @ np.cos(np.outer(angles, orders))).max(axis=1, initial=0.0) * 2 / _POINTS
            agreed = (last <= _AGREE * np.abs(values).max(axis=1, initial=0.0)) | (last * width[:, 0] <= _NOTHING)
        return np.asarray(agreed & np.isfinite(values).all(axis=1))


@dataclass(frozen=True, eq=False)
class Counting:
    """A law of whole numbers without a largest one.

    Attributes
    ----------
    chance, below, above : callable
        P(k), P(≤ k) and P(> k) of an array of whole numbers.
    support : tuple of float
        Least and largest number, one of them infinite.
    """

    chance: Callable[[np.ndarray], np.ndarray]
    below: Callable[[np.ndarray], np.ndarray]
    above: Callable[[np.ndarray], np.ndarray]
    support: tuple[float, float]

    def rule(self, count: int) -> tuple[np.ndarray, np.ndarray]:
        """Return all numbers that count, with their chances, whatever the count."""
        first = next((int(end) for end in self.support if np.isfinite(end)), 0)
        reach = np.arange(-_MOST_NUMBERS, _MOST_NUMBERS + 1) + first
        numbers = reach[(reach >= self.support[0]) & (reach <= self.support[1])]
        beyond = float(np.asarray(self.below(numbers[0] - 1)) + np.asarray(self.above(numbers[-1])))
        if beyond > _NOTHING:
            raise DeclarationError(
                f"a random parameter takes more than {_MOST_NUMBERS} whole numbers that count; averages over it can "
                "only be sampled: quenched(…)"
            )
        chances = np.asarray(self.chance(numbers), dtype=np.float64)
        counted = chances > _TAILS[0]
        return numbers[counted].astype(np.float64), chances[counted] / chances[counted].sum()

    @property
    def leak(self) -> float:
        """Relative doubt about averages."""
        return _ROUNDING


def chance_rule(
    quantile: Callable[[np.ndarray], np.ndarray],
    from_above: Callable[[np.ndarray], np.ndarray],
    count: int,
    low: float = 0.0,
    high: float = 1.0,
) -> tuple[np.ndarray, np.ndarray]:
    """Return nodes and weights for the part of a law between two chances, whatever happens at either.

    The chance is (1 + tanh(π/2 sinh t))/2 of the part, t equidistant (H. Takahasi and M. Mori, Publ. RIMS Kyoto 9, 721
    (1974); from memory).

    Examples
    --------
    >>> nodes, weights = chance_rule(lambda p: -np.log1p(-p), lambda p: -np.log(p), 60)      # exponential law
    >>> round(float(weights @ nodes**2), 12)
    2.0
    """
    t = np.linspace(-_REACH, _REACH, count)
    bent = np.pi / 2 * np.sinh(t)
    weights = np.cosh(t) / np.cosh(bent) ** 2
    weights = weights / weights.sum()
    left, right = 1 / (1 + np.exp(-2 * bent)), 1 / (1 + np.exp(2 * bent))
    below, above = low + (high - low) * left, (1 - high) + (high - low) * right
    places = np.where(below < 0.5, quantile(np.minimum(below, 0.5)), from_above(np.minimum(above, 0.5)))
    return np.asarray(places, dtype=np.float64), weights * (high - low)
