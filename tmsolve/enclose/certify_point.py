"""The verb certify."""

from __future__ import annotations

import math
from fractions import Fraction
from numbers import Integral
from typing import Any

import numpy as np

from .._optional import require
from ..assemble.window import ChainWindow, build_window
from ..declare import Chain, Point
from ..declare.inexact import require_discrete
from ..eigen.components import communicating_classes
from ..errors import NotApplicable, ParameterError, SolveError, TooLargeError
from .arithmetic import Arithmetic, choose_arithmetic
from .balls import Balls
from .bracket import Bracket
from .certificate import Certificate
from .declared import Declared, declared_tables
from .enclosure import Enclosure, decimal_exponent
from .raw import Raw, greater
from .spectrum import EigenvalueBall, enclose_spectrum
from .weights import allowed_pattern, weight_matrix

__all__ = ["certify"]

_MOST_DIGITS = 10000
_LARGEST = 512
_LARGEST_SPECTRUM = 64
#: States times bits up to which a spectrum is tried again with longer numbers.
_SPECTRUM_WORK = 2**16
#: Bits beyond the digits asked for, to begin with.
_MARGIN = 40
#: First, coarse look at every class, as a binary exponent.
_COARSE = -30.0


def certify(point: Point, digits: int = 30, *, bits: int = 4096) -> Certificate:
    """Prove digits of the free energy of an infinite chain at T > 0.

    Energies, parameters, state weights and T count as the exact numbers they were written
    as, a float as its shortest decimal. Every rounding is bounded, so the true value lies
    between the bounds. Numbers grow longer until the digits asked for are certain; if
    ``bits`` are not enough the certificate holds the bounds reached and says so.

    Parameters
    ----------
    point : Point
        One point, made by ``chain.at(T=…, …)``.
    digits : int
        Significant digits of f to prove.
    bits : int
        Longest numbers to try; at least what ``digits`` needs is always allowed.

    Returns
    -------
    Certificate
        Bounds on f and ln λ₁, and for up to 64 joint states balls around the whole
        spectrum of the transfer matrix (with the extra "certified").

    Raises
    ------
    NotApplicable
        T = 0.
    ParameterError
        Not a single point, or digits out of range.
    SolveError
        Every configuration is forbidden, or a function fails.
    TooLargeError
        More than 512 joint states.

    Notes
    -----
    Bounds of Collatz and Wielandt on each class of states, in ball arithmetic where
    python-flint is installed and by directed rounding otherwise. Where a function returns
    rounded numbers (of ``math.exp``, say) the bounds are about the chain with exactly those
    doubles as energies; `Certificate.inexact` names the terms.

    Examples
    --------
    >>> from tmsolve.declare import Chain, bond, ising
    >>> chain = Chain(ising(), [bond(lambda s, t, J: -J*s*t)])
    >>> print(certify(chain.at(T=1, J=1), digits=20))                           # −ln(2 cosh 1)
    -1.126928011042972496444(1)
    """
    _check(point, digits, bits)
    window = build_window(point.chain)
    size = window.shape[0]
    if size > _LARGEST:
        raise TooLargeError(
            f"certify is limited to {_LARGEST} joint states; this chain has {size}. Shorten the longest bond or the "
            "cell, or ask solve for doubles with an error bound",
            limit=_LARGEST,
        )
    declared = declared_tables(window, point.values)
    pattern = allowed_pattern(window, declared)
    classes = communicating_classes(pattern)
    if not classes:
        raise SolveError(
            f"every configuration of the infinite chain is forbidden at {point}; "
            "check which terms return math.inf (or weight 0)"
        )
    brackets = [Bracket(states, pattern[np.ix_(states, states)]) for states in classes]
    log, used = _climb(window, declared, brackets, int(digits), int(bits))

    def spectrum() -> tuple[EigenvalueBall, ...]:
        return _spectrum(window, declared, brackets, int(digits), used.bits)

    return Certificate(
        point=point,
        free_energy=log.times(-declared.temperature),
        log_eigenvalue=log,
        requested=int(digits),
        bits=used.bits,
        inexact=declared.inexact,
        size=size,
        method=used.name,
        _spectrum=spectrum,
    )


def _check(point: Any, digits: Any, bits: Any) -> None:
    if not isinstance(point, Point):
        hint = (
            "bind its parameters first: certify(chain.at(T=…, …))"
            if isinstance(point, Chain)
            else "make one with chain.at(T=…, …)"
        )
        raise ParameterError(f"certify takes a point, got {point!r}; {hint}")
    if point.shape:
        raise ParameterError(
            f"certify takes a single point, got a batch of shape {point.shape}; pick one with point.pick(i)"
        )
    if isinstance(digits, bool) or not isinstance(digits, Integral) or not 1 <= int(digits) <= _MOST_DIGITS:
        raise ParameterError(f"digits= takes a whole number from 1 to {_MOST_DIGITS}, got {digits!r}")
    if isinstance(bits, bool) or not isinstance(bits, Integral) or int(bits) < 64:
        raise ParameterError(f"bits= takes a whole number of at least 64, got {bits!r}")
    if point.values["T"] == 0:
        raise NotApplicable(
            "certify needs T > 0, got T = 0: at zero temperature the ground state is exact already, "
            "ask ground_state(chain)"
        )
    require_discrete(point.chain.cell, "a certificate")


def _climb(
    window: ChainWindow, declared: Declared, brackets: list[Bracket], digits: int, cap: int
) -> tuple[Enclosure, Arithmetic]:
    """Enclose ln λ₁ with longer and longer numbers until its digits are certain."""
    needed = math.ceil(digits * math.log2(10)) + _MARGIN
    bits = -(-(needed + window.shape[0].bit_length()) // 64) * 64
    cap = max(cap, bits)
    while True:
        arithmetic = choose_arithmetic(bits)
        with arithmetic.working():
            weights = weight_matrix(window, declared, arithmetic)
        low, high = _tightened(weights, brackets, arithmetic, -needed + _MARGIN / 2)
        log = Enclosure(*arithmetic.log_ends(low, high))
        if log.digits < digits:
            # A logarithm near 0 needs the eigenvalue to more digits than it has itself.
            low, high = _tightened(weights, brackets, arithmetic, -math.inf)
            log = Enclosure(*arithmetic.log_ends(low, high))
        stuck = any(bracket.exhausted and bracket.high and greater(bracket.high, low) for bracket in brackets)
        if log.digits >= digits or bits >= cap or stuck:
            return log, arithmetic
        small = _binary_exponent(log)
        bits = min(cap, 2 * bits if small is None else max(bits + 64, needed - min(small, 0) + 64))


def _binary_exponent(log: Enclosure) -> int | None:
    """Return about log₂ |ln λ|, None where the sign is not known."""
    if log.lower <= 0 <= log.upper:
        return None
    return math.floor(decimal_exponent(min(abs(log.lower), abs(log.upper))) * math.log2(10))


def _tightened(weights: np.ndarray, brackets: list[Bracket], arithmetic: Arithmetic, target: float) -> tuple[Raw, Raw]:
    """Bound the largest root over all classes; only classes that may hold it are refined."""
    parts = [weights[np.ix_(bracket.states, bracket.states)] for bracket in brackets]
    for goal in (_COARSE, target):
        low = _highest([bracket.low for bracket in brackets])
        for bracket, part in zip(brackets, parts, strict=True):
            if bracket.high is None or greater(bracket.high, low):
                bracket.tighten(part, arithmetic, goal)
    tops = [bracket.high for bracket in brackets if bracket.high is not None]
    return _highest([bracket.low for bracket in brackets]), _highest(tops)


def _highest(numbers: list[Raw]) -> Raw:
    best = numbers[0]
    for number in numbers[1:]:
        best = number if greater(number, best) else best
    return best


def _spectrum(
    window: ChainWindow, declared: Declared, brackets: list[Bracket], digits: int, bits: int
) -> tuple[EigenvalueBall, ...]:
    size = window.shape[0]
    if size > _LARGEST_SPECTRUM:
        raise TooLargeError(
            f"the whole spectrum is enclosed for up to {_LARGEST_SPECTRUM} joint states; this chain has {size}. "
            "The free energy of the certificate holds all the same",
            limit=_LARGEST_SPECTRUM,
        )
    require("flint", extra="certified")
    wanted = Fraction(1, 10**digits)
    longest = max(bits, min(4096, _SPECTRUM_WORK // size))
    while True:
        arithmetic = Balls(bits)
        with arithmetic.working():
            weights = weight_matrix(window, declared, arithmetic)
        found = enclose_spectrum(weights, brackets, arithmetic)
        radius = max(max(ball.real_mantissa.radius, ball.imag_mantissa.radius) for ball in found)
        if radius <= wanted or bits >= longest:
            return found
        bits = min(4 * bits, longest)
