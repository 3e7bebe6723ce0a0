"""Roots of polynomials with real coefficients, each in a disc that is proved to hold exactly one.

Approximations may come from anywhere: python-flint where it is installed, else simultaneous
iteration in long numbers. What makes them certain is computed afterwards from the residuals.

References
----------
.. [1] O. Aberth, Math. Comp. 27, 339 (1973).
.. [2] D. A. Bini, Numer. Algorithms 13, 179 (1996): starting points from the Newton polygon.
.. [3] B. T. Smith, J. ACM 17, 661 (1970): the discs.
"""

from __future__ import annotations

from collections.abc import Callable, Sequence
from itertools import pairwise
from typing import Any

from ...errors import SolveError
from ...operators.midpoints import flint_precision

__all__ = ["Coefficients", "by_argument", "certified_roots", "newton_polygon_points", "together"]

#: Coefficients from the constant term up, and bounds of their errors, at the working precision of mpmath.
Coefficients = Callable[[], tuple[list[Any], list[Any]]]

#: How often the precision is doubled; roots that 32 times as many bits cannot part are equal.
_DOUBLINGS = 6
_ROUNDS = 200


def certified_roots(coefficients: Coefficients, digits: int) -> tuple[list[Any], list[Any]]:
    """Return all roots of a square-free polynomial and the radii of their discs.

    Parameters
    ----------
    coefficients : callable
        Called within a precision of mpmath, which is raised until the discs are small enough.
        The first and the last coefficient are not zero.
    digits : int
        A radius is at most 10^−digits of the modulus of its root.

    Returns
    -------
    roots : list of mpc
        Ascending by argument from 0 to 2π, then by modulus; real roots have no imaginary part.
    radii : list of mpf

    Raises
    ------
    SolveError
        Roots that stay together: the polynomial is not square-free.

    Examples
    --------
    >>> import mpmath
    >>> roots, radii = certified_roots(lambda: ([mpmath.mpf(c) for c in (1, -3, 1)], [0, 0, 0]), 20)
    >>> mpmath.nstr(roots[1], 15), bool(max(radii) < 1e-19)
    ('(2.61803398874989 + 0.0j)', True)
    """
    import mpmath as mp

    bits = max(96, int(3.4 * digits) + 48)
    start: list[Any] | None = None
    for _ in range(_DOUBLINGS):
        with mp.workprec(bits):
            values, errors = coefficients()
            if len(values) < 2:
                return [], []
            roots = _approximate(values, start)
            radii = _discs(values, errors, roots)
            if radii is not None and _small_and_apart(roots, radii, digits):
                return _ordered(roots, radii)
            start = roots
        bits *= 2
    raise SolveError(f"the roots of a polynomial of degree {len(values) - 1} could not be separated to {digits} digits")


def _approximate(values: list[Any], start: list[Any] | None) -> list[Any]:
    if start is None:
        try:
            start = _by_flint(values)
        except (ImportError, ValueError):
            start = newton_polygon_points(values)
    return together(values, start)


def _by_flint(values: list[Any]) -> list[Any]:
    """Isolate the roots by python-flint; `ValueError` where it does not succeed."""
    import mpmath as mp
    from flint import acb_poly, arb, ctx

    def ball(value: Any) -> Any:
        number = mp.mpf(value)
        man, exponent = number.man_exp
        return arb(int(man)) * arb(2) ** exponent

    bits = mp.mp.prec
    with flint_precision(bits, ctx):
        found = acb_poly([ball(value) for value in values]).roots(tol=arb(2) ** (8 - bits), maxprec=8 * bits)
        return [mp.mpc(*(_number(part.mid()) for part in (root.real, root.imag))) for root in found]


def _number(middle: Any) -> Any:
    import mpmath as mp

    man, exponent = middle.man_exp()
    return mp.ldexp(mp.mpf(int(man)), int(exponent))


def newton_polygon_points(values: list[Any]) -> list[Any]:
    """Return points on circles whose radii are the slopes of the upper hull of ln |a_k|."""
    import mpmath as mp

    heights = [(k, mp.log(abs(a))) for k, a in enumerate(values) if a]
    hull: list[tuple[int, Any]] = []
    for point in heights:
        while len(hull) > 1 and _below(hull[-2], hull[-1], point):
            hull.pop()
        hull.append(point)
    points = []
    for (k, low), (m, high) in pairwise(hull):
        radius = mp.exp((low - high) / (m - k))
        # Angles without symmetry, which the iteration would never leave.
        points += [
            radius * mp.expj(2 * mp.pi * (j / mp.mpf(m - k) + mp.mpf("0.11") * k + mp.mpf("0.07")))
            for j in range(m - k)
        ]
    return points


def _below(a: tuple[int, Any], b: tuple[int, Any], c: tuple[int, Any]) -> bool:
    return bool((b[1] - a[1]) * (c[0] - a[0]) <= (c[1] - a[1]) * (b[0] - a[0]))


def together(values: list[Any], start: list[Any]) -> list[Any]:
    """Improve approximations of all roots at once, at the working precision of mpmath."""
    import mpmath as mp

    roots = list(start)
    tiny, small = mp.ldexp(1, -mp.mp.prec + 8), mp.ldexp(1, -(mp.mp.prec // 3))
    moving = set(range(len(roots)))
    before: dict[int, Any] = {}
    for _ in range(_ROUNDS):
        for i in list(moving):
            z = roots[i]
            value, slope = _horner(values, z)
            if not value:
                moving.discard(i)
                continue
            others = mp.fsum(1 / (z - w) for j, w in enumerate(roots) if j != i and z != w)
            change = value / (slope - value * others) if slope != value * others else abs(z) * mp.mpf("0.1")
            roots[i] = z - change
            size = abs(change)
            # Near a root every step is much shorter than the last, until roundings are all that is left.
            if size <= tiny * abs(z) or (size <= small * abs(z) and size > before.get(i, size) / 2):
                moving.discard(i)
            before[i] = size
        if not moving:
            break
    return roots


def _horner(values: Sequence[Any], z: Any) -> tuple[Any, Any]:
    value, slope = values[-1] + 0 * z, 0 * z
    for a in reversed(values[:-1]):
        slope = slope * z + value
        value = value * z + a
    return value, slope


def _discs(values: list[Any], errors: list[Any], roots: list[Any]) -> list[Any] | None:
    """Return radii n |p(z_i)| / |a_n Π (z_i − z_j)|, with upper bounds above and lower bounds below."""
    import mpmath as mp

    degree = len(roots)
    leading = abs(values[-1]) - errors[-1]
    if leading <= 0 or degree != len(values) - 1:
        return None
    unit = mp.ldexp(8 * degree + 16, -mp.mp.prec)
    sizes = [abs(a) * unit + e for a, e in zip(values, errors, strict=True)]
    radii = []
    for i, z in enumerate(roots):
        bound = abs(_horner(values, z)[0]) + _horner(sizes, abs(z))[0]
        apart = mp.fprod(abs(z - w) for j, w in enumerate(roots) if j != i)
        if not apart:
            return None
        radii.append(degree * bound / (leading * apart) * (1 + mp.ldexp(1, -20)))
    return radii


def _small_and_apart(roots: list[Any], radii: list[Any], digits: int) -> bool:
    import mpmath as mp

    tolerance = mp.mpf(10) ** -digits
    if any(radius > tolerance * abs(root) for root, radius in zip(roots, radii, strict=True)):
        return False
    order = sorted(range(len(roots)), key=lambda k: roots[k].real)
    widest = max(radii)
    for place, i in enumerate(order):
        for j in order[place + 1 :]:
            if roots[j].real - roots[i].real > 2 * widest:
                break
            if abs(roots[i] - roots[j]) <= radii[i] + radii[j]:
                return False
    return True


def _ordered(roots: list[Any], radii: list[Any]) -> tuple[list[Any], list[Any]]:
    import mpmath as mp

    # The only root in a disc that meets the real axis is its own complex conjugate.
    snapped = [mp.mpc(z.real, 0) if abs(z.imag) <= r else z for z, r in zip(roots, radii, strict=True)]
    pairs = sorted(zip(snapped, radii, strict=True), key=lambda pair: by_argument(pair[0]))
    return [z for z, _ in pairs], [r for _, r in pairs]


def by_argument(z: Any) -> tuple[Any, Any]:
    """Return the key that orders complex numbers by argument from 0 to 2π, then by modulus."""
    import mpmath as mp

    return mp.arg(z) % (2 * mp.pi), abs(z)
