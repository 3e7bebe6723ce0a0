"""End points of limiting curves from their traces, where the discriminant takes too long.

At an end point the two largest eigenvalues merge and are exchanged: F = ∂F/∂λ = 0 with
∂F/∂z ≠ 0 and ∂²F/∂λ² ≠ 0, F(λ, z) being the characteristic polynomial. Newton's method leads there
from the points of the curve where the ratio of the two is almost 1, and a ball is proved to hold
exactly one solution.

References
----------
.. [1] R. Krawczyk, Computing 4, 187 (1969): the contraction that proves it.
"""

from __future__ import annotations

from collections.abc import Iterator, Sequence
from typing import Any

import numpy as np

from .certified import by_argument
from .pairs import PairProduct
from .secular import Secular

__all__ = ["end_points"]

#: The curve is followed down to this angle between the two largest eigenvalues.
_ANGLE = 2e-3
_ROUNDS = 60
#: Largest step from the end of the trace, relative to |z|.
_FAR = 0.3


def end_points(
    polynomial: Secular, product: PairProduct, start: np.ndarray, angle: float, digits: int
) -> list[tuple[Any, Any]]:
    """Return the end points of a curve and proved bounds of their errors.

    Parameters
    ----------
    polynomial : Secular
        The characteristic polynomial.
    product : PairProduct
        Of its roots.
    start : ndarray of complex128
        Points of the curve at the least angle that was traced.
    angle : float
        That angle.
    digits : int
        Asked of z.
    """
    import mpmath as mp

    while angle > _ANGLE and start.size:
        angle /= 2
        start = product.curve_points(angle, start)
    found: list[tuple[Any, Any]] = []
    with mp.workdps(2 * digits + 40):
        system = _System(product.coefficients(polynomial))
        for z in start:
            edge = _end_point(system, complex(z), product.middle(z), digits)
            if edge is None or any(abs(edge[0] - z) <= edge[1] + radius for z, radius in found):
                continue
            if product.merges_at_the_top(edge[0]):
                found.append(edge)
    return sorted(found, key=lambda edge: by_argument(edge[0]))


class _System:
    """F, its derivatives, and bounds of them, for F = Σ a_kj λ^k z^j."""

    def __init__(self, columns: Sequence[Sequence[Any]]) -> None:
        self.terms = [(k, j, a) for k, column in enumerate(columns) for j, a in enumerate(column) if a]
        self.sizes = [(k, j, abs(a)) for k, j, a in self.terms]

    def derivative(self, root: Any, z: Any, by_root: int, by_z: int, bound: bool = False) -> Any:
        """Return a derivative, or the sum of the moduli of its terms."""
        import mpmath as mp

        terms = self.sizes if bound else self.terms
        powers = _powers(root, max(k for k, _, _ in terms)), _powers(z, max(j for _, j, _ in terms))
        return mp.fsum(
            a * mp.ff(k, by_root) * mp.ff(j, by_z) * powers[0][k - by_root] * powers[1][j - by_z]
            for k, j, a in terms
            if k >= by_root and j >= by_z
        )

    def values(self, root: Any, z: Any) -> tuple[Any, Any]:
        """Return F and ∂F/∂λ."""
        return self.derivative(root, z, 0, 0), self.derivative(root, z, 1, 0)

    def inverse(self, root: Any, z: Any) -> Any:
        """Return the inverse of the Jacobian matrix of F and ∂F/∂λ by (λ, z)."""
        import mpmath as mp

        slopes = [[self.derivative(root, z, 1 + i, 0), self.derivative(root, z, i, 1)] for i in (0, 1)]
        return mp.matrix(slopes) ** -1

    def bends(self, root: Any, z: Any, radii: tuple[Any, Any]) -> list[list[Any]]:
        """Return bounds of how much the entries of the Jacobian matrix change within a ball."""
        most = abs(root) + radii[0], abs(z) + radii[1]
        entries = [[(1 + i, 0), (i, 1)] for i in (0, 1)]
        return [
            [
                radii[0] * self.derivative(*most, a + 1, b, True) + radii[1] * self.derivative(*most, a, b + 1, True)
                for a, b in row
            ]
            for row in entries
        ]


def _powers(x: Any, most: int) -> list[Any]:
    found = [x * 0 + 1]
    for _ in range(most):
        found.append(found[-1] * x)
    return found


def _end_point(system: _System, z: Any, root: Any, digits: int) -> tuple[Any, Any] | None:
    """Return a solution near a point and the radius of a ball that is proved to hold it, or nothing."""
    import mpmath as mp

    first, root, z = z, mp.mpc(root), mp.mpc(z)
    try:
        for _ in range(_ROUNDS):
            step = system.inverse(root, z) * mp.matrix(system.values(root, z))
            root, z = root - step[0], z - step[1]
            if not abs(z - first) <= _FAR * abs(first):
                return None
            if abs(step[1]) <= mp.mpf(10) ** -(digits + 10) * abs(z):
                break
        share = next((r for r in _shares(digits) if _proved(system, root, z, r)), None)
    except ZeroDivisionError:
        return None
    if share is None:
        return None
    radius = share * abs(z)
    # The complex conjugate is a solution too; where both are in one ball they are the same.
    return (mp.mpc(z.real, 0) if abs(z.imag) <= radius else z), radius


def _shares(digits: int) -> Iterator[Any]:
    import mpmath as mp

    for extra in (8, 4, 0):
        yield mp.mpf(10) ** -(digits + extra)


def _proved(system: _System, root: Any, z: Any, share: Any) -> bool:
    """Whether Newton's map with a fixed slope leads a ball, of radii relative to λ and z, into itself."""
    import mpmath as mp

    inverse = system.inverse(root, z)
    radii = share * abs(root), share * abs(z)
    rounding = mp.mpf(10) ** (10 - mp.mp.dps)
    residues = [
        abs(value) + rounding * system.derivative(abs(root), abs(z), i, 0, True)
        for i, value in enumerate(system.values(root, z))
    ]
    bends = system.bends(root, z, radii)
    for i in (0, 1):
        weights = [abs(inverse[i, m]) for m in (0, 1)]
        shift = mp.fdot(weights, residues)
        slope = mp.fdot(weights, [mp.fdot(row, radii) for row in bends])
        if not shift + (1 + rounding) * slope < radii[i]:
            return False
    return True
