"""Where zeros accumulate: the curves |λ₁| = |λ₂| in the complex plane, and their end points.

On the curve λ₁ = λ₂ e^{iθ}. The product over all pairs of λ_i² + λ_j² − 2 cos θ λ_i λ_j is a
polynomial in z; its roots at each θ hold every point of the curve, and those where the pair
is the largest are kept. At θ = 0 it is the discriminant, whose roots are the end points.

References
----------
.. [1] S. Beraha, J. Kahane and N. J. Weiss, Proc. Natl. Acad. Sci. USA 72, 4209 (1975).
.. [2] T. D. Lee and C. N. Yang, Phys. Rev. 87, 410 (1952).
"""

from __future__ import annotations

import math
from dataclasses import dataclass, field, replace
from typing import Any

import numpy as np

from ...declare.chain import Chain
from ...errors import NotApplicable, ParameterError, TooLargeError
from ..arguments import positive_seconds
from ..deadline import Clock, TimeUp, limited
from ..pieces import check_chain
from .certified import by_argument, certified_roots
from .endpoints import end_points
from .fugacity import Fugacity, check_variable, numeric_coefficients
from .pairs import PairProduct
from .secular import Secular, secular
from .squarefree import MixedTerms, generators, square_free_parts

__all__ = ["LimitingCurve", "limiting_curve"]

_LARGEST = 9
#: Polynomials with more coefficients are solved only at about so many angles.
_MANY, _SEEDS = 40, 18
#: Part of the time left that the discriminant may take; most need no more than a second.
_EXACT = 0.5


@dataclass(frozen=True, eq=False, repr=False)
class LimitingCurve:
    """The curves on which the two largest eigenvalues have the same modulus.

    Attributes
    ----------
    points : ndarray of complex128
        Points of the curve.
    angles : ndarray
        θ, with λ₁/λ₂ = e^{iθ}, of each point, 0 < θ ≤ π.
    edges : tuple of mpmath.mpc
        End points: the roots of the discriminant where the two largest eigenvalues merge. Where the
        discriminant takes too long, those that the curve was traced to.
    errors : tuple of mpmath.mpf
        Proved bounds of their errors.
    arcs : tuple of ndarray
        The points in pieces, each in order along the curve.
    has_edges : bool
        False when the time was over before the edges were found; the curve alone takes less time.
    """

    points: np.ndarray
    angles: np.ndarray
    edges: tuple[Any, ...]
    errors: tuple[Any, ...]
    arcs: tuple[np.ndarray, ...]
    fugacity: Fugacity
    has_edges: bool = False
    _discriminant: MixedTerms | None = field(default=None, repr=False)

    @property
    def variable(self) -> str:
        """What z is."""
        return self.fugacity.text

    @property
    def discriminant(self) -> Any:
        """Discriminant of the characteristic polynomial: sympy Poly in z and y₀, y₁, … with whole coefficients.

        The y are the Boltzmann factors of `factors`.
        """
        import sympy as sp

        if self._discriminant is None:
            raise NotApplicable("the discriminant was not found within the time limit; give a longer time_limit")
        return sp.Poly.from_dict(dict(self._discriminant), *generators(1 + len(self.fugacity.rates)), domain=sp.ZZ)

    @property
    def factors(self) -> dict[Any, Any]:
        """Exact values of the Boltzmann factors y in `discriminant`."""
        return self.fugacity.factors

    def __repr__(self) -> str:
        edges = f"{len(self.edges)} edges" if self.has_edges else "edges not known"
        return f"<LimitingCurve in {self.variable}: {len(self.points)} points, {edges}>"


def limiting_curve(
    chain: Chain, variable: str = "h", *, points: int = 180, digits: int = 30, time_limit: float = 60
) -> LimitingCurve:
    """Trace the curves on which the zeros of long chains lie.

    Parameters
    ----------
    chain : Chain
        Everything but the variable is fixed, as for `zeros`.
    variable : str
        A parameter, or ``"T"``. The step of z is that of the matrix; the z of a ring may be a power of it.
    points : int
        Number of angles θ.
    digits : int
        Asked of the edges.
    time_limit : float
        Seconds. When the time is over after the curve has been traced, it is returned without edges.

    Raises
    ------
    ParameterError, NotApplicable, TooLargeError
        As for `zeros`.

    Examples
    --------
    >>> import math
    >>> from tmsolve import Chain, bond, ising, site
    >>> chain = Chain(ising(), [bond(lambda s, t, J: -J*s*t), site(lambda s, h: -h*s)])
    >>> curve = limiting_curve(chain.fix(J=1, T=2))
    >>> curve.discriminant
    Poly(z**2 + 4*z*y0 - 2*z + 1, z, y0, domain='ZZ')
    >>> math.isclose(math.asin(curve.edges[0].imag), 2 * math.asin(math.exp(-1)))
    True
    """
    check_chain(chain, "limiting_curve")
    check_variable(chain, variable)
    allowed = positive_seconds(time_limit)
    for name, value, least, most in (("points", points, 2, 100_000), ("digits", digits, 1, 1000)):
        if isinstance(value, bool) or not isinstance(value, int) or not least <= value <= most:
            raise ParameterError(f"{name} is a whole number from {least} to {most}, got {value!r}")
    clock = Clock(allowed)
    try:
        polynomial, product, found = limited(clock.left, _traced, chain, variable, points)
    except TimeUp:
        raise TooLargeError(
            f"the limiting curve was not traced within {allowed:g} s; ask for fewer points, fix parameters at shorter "
            "decimals, or give a longer time_limit"
        ) from None
    angles = np.concatenate([np.full(len(z), angle) for z, angle in zip(found, _angles(points), strict=True)])
    curve = LimitingCurve(np.concatenate(found), angles, (), (), _linked(found), polynomial.fugacity)
    try:
        discriminant, edges = limited(clock.share(_EXACT), _edges, polynomial, product, digits)
    except TimeUp:
        discriminant = None
        try:
            edges = limited(clock.left, _traced_edges, polynomial, product, found[0], digits, points)
        except TimeUp:
            return curve
    ends, errors = (tuple(edge[k] for edge in edges) for k in range(2))
    return replace(curve, edges=ends, errors=errors, has_edges=True, _discriminant=discriminant)


def _angles(points: int) -> list[float]:
    # Between neighbours, so that neither end of (0, π) is hit.
    return [math.pi * (k + 0.5) / points for k in range(points)]


def _traced(chain: Chain, variable: str, points: int) -> tuple[Secular, PairProduct | None, list[np.ndarray]]:
    polynomial = secular(chain, variable)
    if polynomial.degree > _LARGEST:
        raise TooLargeError(
            f"limiting curves are traced for at most {_LARGEST} different eigenvalues; this chain has "
            f"{polynomial.degree}",
            limit=_LARGEST,
        )
    nothing = np.empty(0, dtype=np.complex128)
    if polynomial.degree == 1:
        return polynomial, None, [nothing] * points
    product = PairProduct(polynomial)
    # Polynomials of high degree are solved at some of the angles; the curve leads on from there.
    stride = 1 if product.size <= _MANY else max(1, points // _SEEDS)
    angles = _angles(points)
    found = [
        product.curve_points(angle, nothing if k % stride else product.candidates(angle))
        for k, angle in enumerate(angles)
    ]
    for sweep in (range(1, points), range(points - 2, -1, -1)):
        for k in sweep:
            found[k] = product.curve_points(angles[k], np.concatenate([found[k], found[k - sweep.step]]))
    return polynomial, product, found


def _width(polynomial: Secular) -> int:
    return 1 + len(polynomial.fugacity.rates)


def _discriminant(polynomial: Secular) -> MixedTerms:
    """Return the discriminant by λ without powers of z, or of the y, that divide it."""
    import sympy as sp

    width = _width(polynomial)
    symbols = [sp.Symbol("lambda"), *generators(width)]
    whole = sp.Poly.from_dict(dict(polynomial.terms), *symbols, domain=sp.ZZ)
    terms = whole.discriminant().terms()
    least = [min(powers[k] for powers, _ in terms) for k in range(width)]
    return {tuple(p - q for p, q in zip(powers, least, strict=True)): int(c) for powers, c in terms}


def _edges(polynomial: Secular, product: PairProduct | None, digits: int) -> tuple[MixedTerms, list[tuple[Any, Any]]]:
    """Return the discriminant, and its roots where the largest eigenvalues merge, with their errors."""
    edges: list[tuple[Any, Any]] = []
    if product is None:
        return {(0,) * _width(polynomial): 1}, edges
    terms = _discriminant(polynomial)
    parts = square_free_parts(terms) if max(powers[0] for powers in terms) else []
    for part, multiplicity in parts:
        # At a root of even order eigenvalues cross without being exchanged.
        if multiplicity % 2:
            roots, radii = certified_roots(numeric_coefficients(part, polynomial.fugacity.rates), digits)
            edges += [(z, r) for z, r in zip(roots, radii, strict=True) if product.merges_at_the_top(z)]
    return terms, sorted(edges, key=lambda edge: by_argument(edge[0]))


def _traced_edges(
    polynomial: Secular, product: PairProduct | None, start: np.ndarray, digits: int, points: int
) -> list[tuple[Any, Any]]:
    return end_points(polynomial, product, start, _angles(points)[0], digits) if product is not None else []


def _linked(found: list[np.ndarray]) -> tuple[np.ndarray, ...]:
    """Join points of neighbouring angles that are nearest to each other."""
    done: list[list[complex]] = []
    growing: list[list[complex]] = []
    for points in found:
        kept: list[list[complex]] = []
        free = set(range(len(points)))
        if len(points) and growing:
            ends = np.array([arc[-1] for arc in growing])
            distance = np.abs(ends[:, None] - points[None, :])
            for a, arc in enumerate(growing):
                b = int(np.argmin(distance[a]))
                near = distance[a, b] <= 0.3 * (abs(ends[a]) + abs(points[b]))
                if b in free and int(np.argmin(distance[:, b])) == a and near:
                    arc.append(complex(points[b]))
                    kept.append(arc)
                    free.discard(b)
        done += [arc for arc in growing if not any(arc is other for other in kept)]
        growing = kept + [[complex(points[b])] for b in sorted(free)]
    return tuple(np.array(arc) for arc in [*done, *growing])
