"""Kinds of laws: discrete mixtures, normal and uniform laws, samplers, and one given realisation."""

from __future__ import annotations

from collections.abc import Callable
from dataclasses import dataclass, field
from fractions import Fraction
from typing import Any, Protocol

import numpy as np

from ..errors import DeclarationError
from .densities import Counting, Density, chance_rule

__all__ = ["Law", "Mixture", "Normal", "Realisation", "Sampler", "Uniform"]

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
        Inverse of the cumulative distribution, for averages over the next draw.
    rule : Density or Counting, optional
        What averages by quadrature; without it they follow from the quantiles.
    """

    function: Callable[[np.random.Generator, Any], Any]
    given_mean: float | None = None
    quantile: Callable[[np.ndarray], Any] | None = None
    rule: Density | Counting | None = None
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
        """Return nodes and weights: of a density where it is known, else of the quantiles."""
        if self.rule is not None:
            return self.rule.rule(count)
        if self.quantile is None:
            raise DeclarationError(
                "a law given as a function can be drawn from but not integrated; give a distribution "
                "with quantiles, or a mixture {value: probability}"
            )
        quantile = self.quantile
        return chance_rule(quantile, lambda above: quantile(1 - above), count)

    @property
    def leak(self) -> float:
        """How far the density given is from one in total."""
        return 0.0 if self.rule is None else self.rule.leak

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
