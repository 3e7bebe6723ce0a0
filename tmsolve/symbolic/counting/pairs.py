"""Pairs of eigenvalues with a given ratio, as functions of a complex variable z."""

from __future__ import annotations

from typing import Any

import numpy as np

from .certified import newton_polygon_points, together
from .fugacity import numeric_coefficients
from .secular import Secular
from .swarm import roots_in_doubles

__all__ = ["PairProduct"]

#: Digits for the coefficients of the product over pairs, which span many orders of magnitude.
_DIGITS = 80
_STEPS = 12
#: How well the two largest moduli agree: before and after the point is refined.
_NEAR, _EQUAL = 0.1, 1e-9


class PairProduct:
    """The polynomial Π_{i<j} (λ_i² + λ_j² − 2 c λ_i λ_j) in z and c = cos θ.

    Parameters
    ----------
    polynomial : Secular
        The characteristic polynomial.
    """

    def __init__(self, polynomial: Secular) -> None:
        import mpmath as mp

        self._degree = polynomial.degree
        with mp.workdps(_DIGITS):
            exact = self.coefficients(polynomial)
            self._exact = exact
            self._in_z = _interpolated(exact, self._degree)
            width = max(map(len, exact))
            table = [[column[j] if j < len(column) else mp.mpf(0) for j in range(width)] for column in exact]
            largest = max(abs(c) for column in table for c in column)
            #: Coefficients of λ^k z^j in doubles, shape (degree + 1, width).
            self.table = np.array([[float(c / largest) for c in column] for column in table])

    @staticmethod
    def coefficients(polynomial: Secular) -> list[list[Any]]:
        """Return the coefficients of λ^k, ascending, each as ascending coefficients of z in the working precision."""
        import mpmath as mp

        columns = []
        for k in range(polynomial.degree + 1):
            terms = {powers[1:]: c for powers, c in polynomial.terms.items() if powers[0] == k}
            columns.append(numeric_coefficients(terms, polynomial.fugacity.rates)()[0] if terms else [])
        return [column or [mp.mpf(0)] for column in columns]

    def middle(self, z: complex) -> complex:
        """Return the mean of the two largest eigenvalues at a point of the curve."""
        values = self._eigenvalues(np.array([z]))[0]
        return complex(values[np.argsort(-np.abs(values))[:2]].mean())

    @property
    def size(self) -> int:
        """Number of coefficients of powers of z."""
        return len(self._in_z)

    def curve_points(self, angle: float, start: np.ndarray) -> np.ndarray:
        """Return the z at which the two largest eigenvalues have the ratio e^{iθ}, found from approximations."""
        z = start
        ratio = np.exp(1j * angle)
        if not z.size:
            return z
        values = self._eigenvalues(z)
        moduli = -np.sort(-np.abs(values), axis=1)
        z, values = (a[moduli[:, 0] - moduli[:, 1] <= _NEAR * moduli[:, 0]] for a in (z, values))
        if not z.size:
            return z
        # λ_i = u λ_j for the pair that comes nearest to it.
        apart = np.abs(values[:, :, None] - ratio * values[:, None, :])
        apart = apart / (np.abs(values[:, :, None]) + np.abs(values[:, None, :]) + 1e-300)
        apart[:, np.arange(self._degree), np.arange(self._degree)] = np.inf
        second = np.argmin(apart.reshape(len(z), -1), axis=1) % self._degree
        z, ok = self._refined(z, values[np.arange(len(z)), second], ratio)
        z = z[ok]
        moduli = -np.sort(-np.abs(self._eigenvalues(z)), axis=1)
        return _distinct(z[moduli[:, 0] - moduli[:, 1] <= _EQUAL * moduli[:, 0]])

    def merges_at_the_top(self, z: Any) -> bool:
        """Return whether the two largest eigenvalues are equal at a root of the discriminant."""
        import mpmath as mp

        with mp.workdps(_DIGITS):
            column = [mp.polyval(coefficients[::-1], z) for coefficients in self._exact]
            found = together(column, newton_polygon_points(column))
            zero = [mp.mpc(0)] * (self._degree - len(found))
            values = sorted([*found, *zero], key=abs, reverse=True)
        # A double root keeps half of the digits of z at least.
        return bool(abs(values[0] - values[1]) <= 1e-7 * abs(values[0]))

    def candidates(self, angle: float) -> np.ndarray:
        """Return all z at which any two eigenvalues have the ratio e^{iθ}, in the accuracy of doubles."""
        import mpmath as mp

        with mp.workdps(_DIGITS):
            c = mp.cos(mp.mpf(angle))
            column = [mp.polyval(powers[::-1], c) for powers in self._in_z]
            largest = max(map(abs, column))
            there = [k for k, a in enumerate(column) if abs(a) > largest * mp.mpf(10) ** (20 - _DIGITS)]
            column = column[there[0] : there[-1] + 1]
            if len(column) < 2:
                return np.empty(0, dtype=np.complex128)
            numbers = np.array([float(a / largest) for a in column])
        return roots_in_doubles(numbers)

    def _eigenvalues(self, z: np.ndarray) -> np.ndarray:
        """Return the eigenvalues at many points, shape (points, degree)."""
        columns = np.polynomial.polynomial.polyval(z, self.table.T, tensor=True)
        size = self._degree
        companion = np.zeros((len(z), size, size), dtype=np.complex128)
        companion[:, np.arange(1, size), np.arange(size - 1)] = 1
        companion[:, :, -1] = -(columns[:-1] / columns[-1]).T
        return np.linalg.eigvals(companion).astype(np.complex128)

    def _refined(self, z: np.ndarray, root: np.ndarray, ratio: complex) -> tuple[np.ndarray, np.ndarray]:
        """Solve χ(λ, z) = χ(u λ, z) = 0 by Newton's method from many points."""
        polynomial = np.polynomial.polynomial
        table = self.table
        by_root, by_z = polynomial.polyder(table, axis=0), polynomial.polyder(table, axis=1)
        change = np.full(z.shape, np.inf)
        with np.errstate(all="ignore"):
            for _ in range(_STEPS):
                f, g = (polynomial.polyval2d(w, z, table) for w in (root, ratio * root))
                a, b = polynomial.polyval2d(root, z, by_root), polynomial.polyval2d(root, z, by_z)
                c = ratio * polynomial.polyval2d(ratio * root, z, by_root)
                d = polynomial.polyval2d(ratio * root, z, by_z)
                determinant = a * d - b * c
                shift = (a * g - c * f) / determinant
                root = root - (d * f - b * g) / determinant
                z = z - shift
                change = np.abs(shift)
                if (change <= 1e-14 * np.abs(z)).all():
                    break
            ok = np.isfinite(z) & np.isfinite(root) & (change <= 1e-10 * np.abs(z)) & (z != 0)
        return z, ok


def _interpolated(columns: list[list[Any]], degree: int) -> list[list[Any]]:
    """Return the coefficients of z^j of the product, each as ascending coefficients of c."""
    import mpmath as mp

    leading = len(columns[-1]) - 1
    slope = max((mp.mpf(len(column) - 1) / (degree - k) for k, column in enumerate(columns[:-1])), default=0)
    # The product is of degree n (n − 1) in λ, and its leading coefficient is that of χ to the power 2 (n − 1).
    size = int(mp.floor(degree * (degree - 1) * slope)) + 1 + 2 * (degree - 1) * leading
    samples, places = [], []
    roots: list[Any] = []
    for k in range(size):
        z = mp.expjpi(2 * (k + mp.mpf("0.37")) / size)
        column = [mp.polyval(coefficients[::-1], z) for coefficients in columns]
        roots = together(column, roots or newton_polygon_points(column))
        places.append(z)
        samples.append(_pair_polynomial(roots, column[-1] ** (2 * (degree - 1))))
    return _fourier(samples, places)


def _fourier(samples: list[list[Any]], places: list[Any]) -> list[list[Any]]:
    """Return the real coefficients of z^j of polynomials known at points z of the unit circle."""
    import mpmath as mp

    size = len(places)
    parts = [([v.real for v in column], [v.imag for v in column]) for column in zip(*samples, strict=True)]
    waves, inverse = [mp.mpc(1)] * size, [mp.conj(z) for z in places]
    result = []
    for _ in range(size):
        real, imag = [w.real for w in waves], [w.imag for w in waves]
        result.append([(mp.fdot(a, real) - mp.fdot(b, imag)) / size for a, b in parts])
        waves = [w * v for w, v in zip(waves, inverse, strict=True)]
    return result


def _pair_polynomial(roots: list[Any], factor: Any) -> list[Any]:
    """Return factor · Π (a − 2 c b) over pairs, a = λ_i² + λ_j², b = λ_i λ_j, as ascending coefficients of c."""
    import mpmath as mp

    total = [mp.mpc(factor)]
    for i, x in enumerate(roots):
        for y in roots[:i]:
            a, b = x * x + y * y, -2 * x * y
            shifted = [mp.mpc(0), *(t * b for t in total)]
            total = [a * t + s for t, s in zip([*total, mp.mpc(0)], shifted, strict=True)]
    return total


def _distinct(z: np.ndarray) -> np.ndarray:
    kept: list[complex] = []
    for value in z:
        if all(abs(value - other) > 1e-7 * abs(value) for other in kept):
            kept.append(complex(value))
    return np.array(kept, dtype=np.complex128)
