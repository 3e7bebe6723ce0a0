"""The whole spectrum of a small transfer matrix, enclosed in balls (python-flint)."""

from __future__ import annotations

from collections.abc import Sequence
from dataclasses import dataclass
from fractions import Fraction
from functools import cached_property
from typing import Any

import numpy as np

from ..errors import NotApplicable
from .balls import Balls, ball_ends
from .bracket import Bracket
from .enclosure import Enclosure
from .raw import raw_fraction

__all__ = ["EigenvalueBall", "enclose_spectrum"]

_ZERO = Enclosure(Fraction(0), Fraction(0))
#: Binary exponents beyond which an eigenvalue is not written out as a fraction.
_LARGEST_EXPONENT = 10**7
#: Digits that are printed.
_SHOWN = 32


@dataclass(frozen=True)
class EigenvalueBall:
    """A rectangle of the complex plane that holds exactly ``multiplicity`` eigenvalues.

    Eigenvalues closer to each other than the balls can tell share one. To stay writable at
    any temperature they are kept as mantissa × 2^exponent.

    Attributes
    ----------
    multiplicity : int
        Algebraic multiplicities, added up.
    exponent : int
    real_mantissa, imag_mantissa : Enclosure
    """

    multiplicity: int
    exponent: int
    real_mantissa: Enclosure
    imag_mantissa: Enclosure

    @cached_property
    def real(self) -> Enclosure:
        """Real part."""
        return self.real_mantissa.times(self._power())

    @cached_property
    def imag(self) -> Enclosure:
        """Imaginary part; exactly 0 where the eigenvalue is proved to be real."""
        return self.imag_mantissa.times(self._power())

    def _power(self) -> Fraction:
        if abs(self.exponent) > _LARGEST_EXPONENT:
            raise NotApplicable(
                f"this eigenvalue is of the order of 2^{self.exponent}, too far from 1 to be written as a fraction; "
                "use real_mantissa and imag_mantissa"
            )
        return Fraction(2) ** self.exponent

    def contains(self, value: Any) -> bool:
        """Whether a real or complex number lies in the rectangle."""
        if isinstance(value, complex) or hasattr(value, "_mpc_"):
            return self.real.contains(value.real) and self.imag.contains(value.imag)
        return self.imag.contains(0) and self.real.contains(value)

    def __str__(self) -> str:
        plain = abs(self.exponent) < 4000
        real, imag = (self.real, self.imag) if plain else (self.real_mantissa, self.imag_mantissa)
        text = real.text(_SHOWN)
        if imag != _ZERO:
            text = f"{text} + i·({imag.text(_SHOWN)})"
        if not plain:
            text = f"({text})·2^{self.exponent}"
        return text if self.multiplicity == 1 else f"{text} (multiplicity {self.multiplicity})"


@dataclass(frozen=True)
class _Box:
    """A rectangle with the number of eigenvalues in it."""

    count: int
    real: Enclosure
    imag: Enclosure

    def touches(self, other: _Box) -> bool:
        return self.real.overlaps(other.real) and self.imag.overlaps(other.imag)

    def joined(self, other: _Box) -> _Box:
        return _Box(self.count + other.count, _hull(self.real, other.real), _hull(self.imag, other.imag))

    def mirrored(self) -> _Box:
        return _Box(self.count, self.real, self.imag.times(Fraction(-1)))


def _hull(a: Enclosure, b: Enclosure) -> Enclosure:
    return Enclosure(min(a.lower, b.lower), max(a.upper, b.upper))


def enclose_spectrum(weights: np.ndarray, brackets: Sequence[Bracket], arithmetic: Balls) -> tuple[EigenvalueBall, ...]:
    """Enclose all eigenvalues of a matrix, largest modulus first.

    Every class is turned by its Perron vector into a matrix with row sums near a power of
    two, so that balls are small relative to the largest eigenvalue. States outside every
    class contribute eigenvalues that are exactly 0.

    Parameters
    ----------
    weights : ndarray of object, shape (n, n)
        Balls of ``arithmetic``.
    brackets : sequence of Bracket
        One per class, tightened.
    arithmetic : Balls
    """
    tops = [bracket.high for bracket in brackets if bracket.high is not None]
    exponent = max(top[2] + top[3] for top in tops)
    boxes: list[_Box] = []
    for bracket in brackets:
        pick = np.ix_(bracket.states, bracket.states)
        boxes += _class_boxes(weights[pick], bracket, arithmetic, exponent)
    transient = len(weights) - sum(len(bracket.states) for bracket in brackets)
    if transient:
        boxes.append(_Box(transient, _ZERO, _ZERO))
    merged = _merged(boxes)
    proved = [_real_if_proved(box, merged) for box in merged]
    proved.sort(key=lambda box: box.real.middle**2 + box.imag.middle**2, reverse=True)
    return tuple(EigenvalueBall(box.count, exponent, box.real, box.imag) for box in proved)


def _class_boxes(weights: np.ndarray, bracket: Bracket, arithmetic: Balls, exponent: int) -> list[_Box]:
    flint = arithmetic.flint
    n = len(weights)
    assert bracket.high is not None
    with arithmetic.working():
        x = np.empty(n, dtype=object)
        x[:] = [arithmetic.exact(entry._mpf_) for entry in bracket.balance()]
        shift = arithmetic.exact((0, 1, -exponent, 1))
        similar = weights * x[None, :] / x[:, None] * shift
        try:
            found = flint.acb_mat(flint.arb_mat(similar.tolist())).eig(multiple=True)
        except ValueError:  # these numbers do not even separate clusters; all lie in the disc of the largest
            top = raw_fraction(bracket.high) / Fraction(2) ** exponent
            return [_Box(n, Enclosure(-top, top), Enclosure(-top, top))]
        return [_Box(1, _enclosure(ball.real), _enclosure(ball.imag)) for ball in found]


def _enclosure(ball: Any) -> Enclosure:
    low, high = ball_ends(ball)
    return Enclosure(raw_fraction(low), raw_fraction(high))


def _merged(boxes: Sequence[_Box]) -> list[_Box]:
    """Join boxes that touch until none do; each then holds as many eigenvalues as it counts."""
    done: list[_Box] = []
    for box in boxes:
        joined = box
        while touching := [other for other in done if other.touches(joined)]:
            done = [other for other in done if other not in touching]
            for other in touching:
                joined = joined.joined(other)
        done.append(joined)
    return done


def _real_if_proved(box: _Box, boxes: Sequence[_Box]) -> _Box:
    """Drop the imaginary part of a single eigenvalue whose conjugate could only be itself."""
    if box.count > 1 or not box.imag.contains(0):
        return box
    mirrored = box.mirrored()
    if any(other is not box and other.touches(mirrored) for other in boxes):
        return box
    return _Box(1, box.real, _ZERO)
