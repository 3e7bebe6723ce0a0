"""Laws of random parameters: discrete mixtures, distributions, samplers, and one given realisation."""

from __future__ import annotations

import math
from collections.abc import Callable, Mapping, Sequence
from dataclasses import dataclass, field
from fractions import Fraction
from typing import Any, Protocol

import numpy as np

from ..declare.values import parse_value
from ..errors import DeclarationError, ParameterError

__all__ = ["Law", "Mixture", "Normal", "Realisation", "Sampler", "Uniform", "as_law"]

#: Probabilities given in doubles may miss one by so much.
_ROUNDING = Fraction(1, 10**12)
#: A discrete distribution with more values than this is drawn from, never summed over.
_MOST_VALUES = 10_000
#: Deviations beyond which a normal law is nothing to a double.
_TAIL = 9.0

Shape = int | tuple[int, ...]


class Law(Protocol):
    """What the averages need to know of a random parameter.

    Attributes
    ----------
    mean : float
        Always finite.
    support : tuple of (value, probability) or None
        All values with their exact probabilities; ``None`` when it is not a finite list.
    """

    @property
    def mean(self) -> float:
        """Mean value."""

    @property
    def support(self) -> tuple[tuple[Fraction, Fraction], ...] | None:
        """Values and probabilities of a discrete law."""

    def draw(self, rng: np.random.Generator, shape: Shape) -> np.ndarray:
        """Draw independent values in doubles."""

    def quadrature(self, count: int) -> tuple[np.ndarray, np.ndarray]:
        """Return nodes and weights that replace the law in an average."""


@dataclass(frozen=True)
class Mixture:
    """A discrete law: finitely many values, each with its exact probability."""

    support: tuple[tuple[Fraction, Fraction], ...]

    @property
    def mean(self) -> float:
        """Mean value."""
        return float(sum(value * chance for value, chance in self.support))

    def draw(self, rng: np.random.Generator, shape: Shape) -> np.ndarray:
        """Draw independent values."""
        values, chances = self.quadrature(0)
        steps = np.cumsum(chances)[:-1]
        return np.asarray(values[np.searchsorted(steps, rng.random(shape), side="right")])

    def quadrature(self, count: int) -> tuple[np.ndarray, np.ndarray]:
        """Return the values and probabilities themselves, whatever the count."""
        return np.array([float(v) for v, _ in self.support]), np.array([float(p) for _, p in self.support])

    def __str__(self) -> str:
        return f"choice({','.join(f'{float(value):g}:{float(chance):g}' for value, chance in self.support)})"


@dataclass(frozen=True)
class Normal:
    """The normal law with a mean and a standard deviation > 0."""

    mean: float
    deviation: float
    support: None = field(default=None, init=False, repr=False)

    def draw(self, rng: np.random.Generator, shape: Shape) -> np.ndarray:
        """Draw independent values."""
        return self.mean + self.deviation * rng.standard_normal(shape)

    def quadrature(self, count: int) -> tuple[np.ndarray, np.ndarray]:
        """Return equidistant nodes: against a normal density the trapezoidal rule converges faster than any power."""
        nodes = np.linspace(-_TAIL, _TAIL, count)
        weights = np.exp(-(nodes**2) / 2)
        return self.mean + self.deviation * nodes, weights / weights.sum()

    def __str__(self) -> str:
        return f"normal({self.mean:g},{self.deviation:g})"


@dataclass(frozen=True)
class Uniform:
    """The uniform law between two numbers."""

    low: float
    high: float
    support: None = field(default=None, init=False, repr=False)

    @property
    def mean(self) -> float:
        """Mean value."""
        return (self.low + self.high) / 2

    def draw(self, rng: np.random.Generator, shape: Shape) -> np.ndarray:
        """Draw independent values."""
        return rng.uniform(self.low, self.high, shape)

    def quadrature(self, count: int) -> tuple[np.ndarray, np.ndarray]:
        """Return Gauss and Legendre's nodes and weights."""
        nodes, weights = np.polynomial.legendre.leggauss(count)
        return self.mean + (self.high - self.low) / 2 * nodes, weights / 2

    def __str__(self) -> str:
        return f"uniform({self.low:g},{self.high:g})"


@dataclass(frozen=True)
class Sampler:
    """A law known by its draws: a function of a generator and a size, or a distribution object.

    Attributes
    ----------
    function : callable
        ``f(rng, size) -> array`` of independent values.
    given_mean : float or None
        The mean, where the giver states it; else it is estimated when asked for.
    quantile : callable or None
        Inverse of the cumulative distribution, for averages by quadrature.
    """

    function: Callable[[np.random.Generator, Any], Any]
    given_mean: float | None = None
    quantile: Callable[[np.ndarray], Any] | None = None
    support: None = field(default=None, init=False, repr=False)

    @property
    def mean(self) -> float:
        """Mean value; of a bare function that of 100 000 draws with a seed of their own."""
        if self.given_mean is not None:
            return self.given_mean
        return float(self.draw(np.random.default_rng(0), 100_000).mean())

    def draw(self, rng: np.random.Generator, shape: Shape) -> np.ndarray:
        """Draw independent values and check what came."""
        size = (shape,) if isinstance(shape, int) else tuple(shape)
        values = np.asarray(self.function(rng, size))
        if values.shape != size or values.dtype.kind not in "iuf":
            raise DeclarationError(
                f"a sampler was asked for {size} numbers and returned {values.dtype.name} of shape {values.shape}; "
                "write it as f(rng, size) that returns real numbers of that size"
            )
        if not np.isfinite(values).all():
            raise DeclarationError("a sampler returned a value that is not finite; random parameters are real numbers")
        return values.astype(np.float64)

    def quadrature(self, count: int) -> tuple[np.ndarray, np.ndarray]:
        """Return nodes at quantiles of Gauss and Legendre's rule."""
        if self.quantile is None:
            raise DeclarationError(
                "a law given as a function can be drawn from but not integrated; give a distribution "
                "with quantiles, or a mixture {value: probability}"
            )
        nodes, weights = np.polynomial.legendre.leggauss(count)
        return np.asarray(self.quantile((1 + nodes) / 2), dtype=np.float64), weights / 2

    def __str__(self) -> str:
        return "sampler"


@dataclass(frozen=True, eq=False)
class Realisation:
    """One given realisation: a value per copy of the term, in order along the chain."""

    values: np.ndarray
    support: None = field(default=None, init=False, repr=False)

    @property
    def mean(self) -> float:
        """Mean of the list."""
        return float(self.values.mean())

    def draw(self, rng: np.random.Generator, shape: Shape) -> np.ndarray:
        """Refuse: a list is read, not drawn from."""
        raise DeclarationError("a list of values is one realisation and cannot be drawn from; give a distribution")

    def quadrature(self, count: int) -> tuple[np.ndarray, np.ndarray]:
        """Return the list with equal weights: its empirical law."""
        return self.values, np.full(len(self.values), 1 / len(self.values))

    def __str__(self) -> str:
        return f"list of {len(self.values)}"


def as_law(value: Any) -> Law:
    """Read the law of a random parameter in any of the forms a user may give it.

    Parameters
    ----------
    value : mapping, distribution, callable, sequence, str or Law
        ``{value: probability}``; an object with scipy.stats' frozen interface
        (``rvs(size, random_state)`` and ``mean()``); a function ``f(rng, size)``; a list of values, which is one
        realisation; or a text such as ``"normal(1,0.5)"``, ``"uniform(-1,1)"``, ``"choice(-1:0.5,1:0.5)"``.

    Returns
    -------
    Law
        With ``draw(rng, shape)``, ``mean``, ``support`` and ``quadrature(count)``.

    Raises
    ------
    DeclarationError
        No such law, an infinite mean, or probabilities that do not sum to one.
    ParameterError
        A value that is not a real number.

    Examples
    --------
    >>> law = as_law({-1: "1/3", 1: "2/3"})
    >>> law.support
    ((Fraction(-1, 1), Fraction(1, 3)), (Fraction(1, 1), Fraction(2, 3)))
    >>> as_law("normal(1, 0.5)").mean
    1.0
    """
    if isinstance(value, (Mixture, Normal, Uniform, Sampler, Realisation)):
        return value
    if isinstance(value, str):
        from .texts import read_law

        return as_law(read_law(value))
    if isinstance(value, Mapping):
        return _mixture(value)
    if hasattr(value, "rvs") and hasattr(value, "mean"):
        return _distribution(value)
    if callable(value):
        return Sampler(value)
    if isinstance(value, (Sequence, np.ndarray)):
        return _realisation(value)
    raise DeclarationError(
        f"the law of a random parameter is {{value: probability}}, a distribution of scipy.stats, a function "
        f'f(rng, size), a list of values, or a text such as "normal(1,0.5)"; got {value!r}'
    )


def _mixture(given: Mapping[Any, Any]) -> Mixture:
    if not given:
        raise DeclarationError("a mixture needs at least one value: {value: probability}")
    chances: dict[Fraction, Fraction] = {}
    for raw, chance in given.items():
        value, part = parse_value("random", raw), _probability(raw, chance)
        if not isinstance(value, Fraction):
            raise ParameterError(f"a random parameter takes finite numbers, got {raw!r}")
        chances[value] = chances.get(value, Fraction(0)) + part
    total = sum(chances.values(), Fraction(0))
    if abs(total - 1) > _ROUNDING:
        raise DeclarationError(f"the probabilities of a mixture sum to {float(total):g}, not to one; got {dict(given)}")
    return Mixture(tuple((value, chance / total) for value, chance in chances.items() if chance))


def _probability(value: Any, chance: Any) -> Fraction:
    try:
        part = parse_value("probability", chance)
    except ParameterError:
        part = None  # type: ignore[assignment]
    if not isinstance(part, Fraction) or part < 0:
        raise DeclarationError(f"the probability of {value!r} must be a number from 0 to 1, got {chance!r}")
    return part


def _realisation(given: Any) -> Realisation:
    values = parse_value("random", given)
    if not isinstance(values, np.ndarray) or values.ndim != 1 or not np.isfinite(values).all():
        raise DeclarationError(f"a list of values is one row of finite numbers, got {given!r}")
    return Realisation(values)


def _distribution(given: Any) -> Law:
    mean = float(given.mean())
    if not math.isfinite(mean):
        raise DeclarationError(
            f"the law {_named(given)} has the mean {mean:g}, and averages over it do not exist; give one with a "
            "finite mean"
        )
    if hasattr(given, "std") and float(given.std()) == 0.0:
        return _mixture({mean: 1})
    name = _named(given)
    if name == "norm":
        return Normal(mean, float(given.std()))
    if name == "uniform":
        low, high = given.support()
        return Uniform(float(low), float(high))
    discrete = _discrete(given)
    if discrete is not None:
        return discrete
    return Sampler(lambda rng, size: given.rvs(size=size, random_state=rng), mean, getattr(given, "ppf", None))


def _named(given: Any) -> str:
    return str(getattr(getattr(given, "dist", None), "name", None) or type(given).__name__)


def _discrete(given: Any) -> Mixture | None:
    if not hasattr(getattr(given, "dist", None), "pmf"):
        return None
    known = getattr(given.dist, "xk", None)
    low, high = given.support()
    if known is None and (not math.isfinite(low) or not math.isfinite(high) or high - low > _MOST_VALUES):
        return None
    values = np.asarray(known if known is not None else np.arange(int(low), int(high) + 1))
    return _mixture({value.item(): float(given.pmf(value)) for value in values})
