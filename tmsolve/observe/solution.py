"""The solution of an infinite chain: what can be asked of it."""

from __future__ import annotations

from collections.abc import Mapping, Sequence
from dataclasses import dataclass, field
from typing import Any

import numpy as np

from ..declare import Point
from ..errors import NotApplicable, SolveError, listing
from .amplitudes import amplitudes
from .arguments import check_count, read_derivative, read_distances, read_wave_numbers
from .bounds import diagnose, error_bounds
from .correlations import connected_correlation
from .evaluate import Laws
from .lengths import decays, gaps, lengths, log_gaps
from .levels import Level, levels
from .quantities import DIFFERENTIABLE, Quantity, parse_quantity, series_of
from .slow import Decay
from .structure import structure_factors

__all__ = ["Solution"]


@dataclass(frozen=True, eq=False)
class Solution:
    """Thermodynamics, derivatives, correlations and spectrum per unit cell.

    Every quantity has the shape of the batch of points, ``()`` for a single point. k_B = 1;
    energies in the user's unit. Nothing is computed before it is asked for.

    Attributes
    ----------
    point : Point
        Where the chain was solved.
    laws : Laws
        Stationary laws of the batch.

    Examples
    --------
    >>> from tmsolve import Chain, bond, ising, solve
    >>> chain = Chain(ising(), [bond(lambda s, t, J: -J*s*t)], observables={"m": lambda s: s})
    >>> r = solve(chain.at(T=1, J=1))
    >>> round(float(r.free_energy), 12)                           # −ln 2cosh 1
    -1.126928011043
    >>> round(float(r.susceptibility("m")), 12)                   # e² (Curie-like, T = 1)
    7.389056098931
    """

    point: Point
    laws: Laws = field(repr=False)

    @property
    def shape(self) -> tuple[int, ...]:
        """Shape of the batch."""
        return self.point.shape

    def _value(self, quantity: Quantity, names: Sequence[str] = ()) -> np.ndarray:
        series = series_of(quantity, self.point.chain)
        for name in names:
            series = series.derive(name)
        return self._shaped(self.laws.evaluate(series), f"{quantity}")

    def _shaped(self, flat: np.ndarray, what: str) -> np.ndarray:
        unknown = np.asarray(flat != flat, dtype=bool)
        if unknown.any():
            index = int(np.argwhere(unknown)[0][0])
            raise SolveError(f"{what} could not be computed at {self.point.pick(index)}")
        return flat.reshape((*self.shape, *flat.shape[1:]))[()]

    @property
    def free_energy(self) -> np.ndarray:
        """Free energy f = −T ln λ₁ per cell, in energy units."""
        return self._value(Quantity("free_energy"))

    @property
    def internal_energy(self) -> np.ndarray:
        """Internal energy u = ∂(βf)/∂β per cell at fixed parameters, in energy units."""
        return self._value(Quantity("internal_energy"))

    @property
    def entropy(self) -> np.ndarray:
        """Entropy s = −∂f/∂T per cell, in units of k_B."""
        return self._value(Quantity("entropy"))

    @property
    def specific_heat(self) -> np.ndarray:
        """Specific heat c = ∂u/∂T per cell, in units of k_B."""
        return self._value(Quantity("specific_heat"))

    def mean(self, a: str) -> np.ndarray:
        """Mean ⟨a⟩ per cell of an observable.

        Accurate absolutely: where ⟨a⟩ is a difference of nearly equal parts, its relative
        accuracy is less.
        """
        return self._value(self._quantity("mean", a))

    def susceptibility(self, a: str, b: str | None = None) -> np.ndarray:
        """Susceptibility ∂⟨a⟩/∂φ for an added energy −φ·b, = (1/T) Σ_r of the connected ⟨a₀b_r⟩."""
        return self._value(self._quantity("susceptibility", a, b))

    def temperature_susceptibility(self, a: str, b: str | None = None) -> np.ndarray:
        """T times the susceptibility: the sum over r of the connected correlation."""
        return self._value(self._quantity("temperature_susceptibility", a, b))

    def _quantity(self, name: str, *observables: str | None) -> Quantity:
        wanted = tuple(a for a in observables if a is not None)
        for a in wanted:
            self.point.chain.observable(a)
        return Quantity(name, wanted)

    def derivative(self, *names: str, of: str = "free_energy") -> np.ndarray:
        """Exact derivative by parameters and ``"T"``, of the free energy or another quantity.

        Parameters
        ----------
        *names : str
            Parameter names, repeated for higher orders; ``"T"`` for the temperature.
        of : str
            A quantity that is itself a derivative of f, such as ``"specific_heat"`` or
            ``"susceptibility(m)"``.

        Raises
        ------
        ParameterError
            Unknown name or quantity.
        NotApplicable
            A quantity that is no derivative of the free energy, or too high an order.

        Examples
        --------
        >>> from tmsolve import Chain, bond, ising, solve
        >>> r = solve(Chain(ising(), [bond(lambda s, t, J: -J*s*t)]).at(T=1, J=1))
        >>> round(float(r.derivative("J")), 12)                   # −tanh 1
        -0.761594155956
        """
        quantity = read_derivative(names, of, self.point.chain)
        return self._value(quantity, names)

    def correlation(self, a: str, b: str, distances: Any, connected: bool = True) -> np.ndarray:
        """Two-point function ⟨a₀ b_r⟩ at distances r in cells, shape (*batch, distances).

        Parameters
        ----------
        a, b : str
            Observables, summed over the cell.
        distances : int or sequence of int
            Cells from a to b; negative ones lie to the left.
        connected : bool
            Whether ⟨a⟩⟨b⟩ is subtracted.
        """
        wanted = read_distances(distances)
        chain = self.point.chain
        chain.observable(a), chain.observable(b)
        window, _ = self.laws.resolved((a, b))
        values = self.laws.collect(
            lambda segment: connected_correlation(window, segment, self.point, a, b, wanted), (a, b), (len(wanted),)
        )
        if not connected:
            means = self.mean(a) * self.mean(b)
            values = values + np.reshape(means, (-1, 1))
        shaped = self._shaped(values, f"correlation of {a} and {b}")
        return shaped[..., 0] if np.ndim(distances) == 0 else shaped

    def structure_factor(self, a: str, k: Any) -> np.ndarray:
        """Structure factor S(k) = Σ_r e^{ikr} (⟨a₀a_r⟩ − ⟨a⟩²) at wave numbers k per cell.

        S(0) is T times the susceptibility. Shape (*batch, wave numbers), or the batch for a
        single k.

        Examples
        --------
        >>> from tmsolve import models, solve
        >>> r = solve(models.load("ising").chain.at(T="1/20", J=1, h=0))
        >>> print(f"{r.structure_factor('m', 1e-3):.8e}")       # (1−t²)/(1−2t cos k+t²), t = tanh(J/T)
        1.69934184e-11
        """
        wanted = read_wave_numbers(k)
        self.point.chain.observable(a)
        shaped = self._shaped(structure_factors(self.laws, a, wanted), f"structure factor of {a}")
        return shaped[..., 0] if np.ndim(k) == 0 else shaped

    def correlation_length(self, a: str | None = None) -> np.ndarray:
        """Decay length ξ in cells: of the second eigenvalue, or of the slowest mode that ``a`` shows.

        0 where nothing decays slower than at once; inf where two eigenvalues coincide in modulus, or ξ exceeds
        the doubles, see `log_correlation_length`. A mode of ``a`` counts however small; what cannot be decided
        is a SolveError. Without ``a``, ξ < 0.03 may be 0: at energies beyond 1e4 T, 40 states, 400 such points.
        """
        return self._shaped(lengths(self._decay(a)), "correlation length")

    def log_correlation_length(self, a: str | None = None) -> np.ndarray:
        """Natural logarithm ln ξ of the same length in cells, also where ξ exceeds all doubles.

        −inf where ξ = 0; inf only where two eigenvalues coincide in modulus exactly, or in the
        limit T → 0 where ξ diverges.

        Examples
        --------
        >>> from tmsolve import models, solve
        >>> r = solve(models.load("ising").chain.at(T="1e-8", J=1, h=0))
        >>> print(f"{r.log_correlation_length():.9f}")              # 2J/T − ln 2
        199999999.306852819
        """
        return self._shaped(-self._decay(a).log_gap, "logarithm of the correlation length")

    def wave_number(self, a: str | None = None) -> np.ndarray:
        """Wave number in [0, π] per cell of the same mode: 0 monotonic, π alternating."""
        return self._shaped(self._decay(a).wave_number, "wave number")

    def correlation_amplitude(self, a: str) -> np.ndarray:
        """Amplitude A of the same mode: ⟨a₀a_r⟩ − ⟨a⟩² → A r^p cos(kr + φ) e^{−r/ξ} at large r; 0 where there is none.

        p is the `correlation_power`. Of eigenvalues that nearly coincide the slowest alone counts, equal ones
        count together; what neither doubles nor longer numbers tell apart is a SolveError.
        """
        return self._shaped(self._amplitude(a).amplitude, "correlation amplitude")

    def correlation_power(self, a: str) -> np.ndarray:
        """Power p of the distance in that law: 0, or more where ``a`` shows an eigenvalue with a Jordan block."""
        return self._shaped(self._amplitude(a).power.astype(int), "power of the distance")

    def _amplitude(self, a: str) -> Decay:
        self.point.chain.observable(a)
        return amplitudes(self.laws, self.point, a)

    def _decay(self, a: str | None) -> Decay:
        if a is not None:
            self.point.chain.observable(a)
        return decays(self.laws, self.point, a)

    def gaps(self, k: int) -> np.ndarray:
        """Gaps ln λ₁/|λ_i| of the next k eigenvalues, counted with multiplicity, shape (*batch, k).

        inf where the matrix has no further eigenvalue, or it is 0 or out of reach of the longest numbers.
        """
        check_count("k", k)
        return self._shaped(gaps(self.laws, self.point, int(k)), "gaps")

    def log_gaps(self, k: int) -> np.ndarray:
        """Natural logarithms of the `gaps`, finite where gaps are below all doubles; −inf where they vanish exactly."""
        check_count("k", k)
        return self._shaped(log_gaps(self.laws, self.point, int(k)), "logarithms of gaps")

    @np.errstate(under="ignore")
    def spectrum(self, k: int | None = None) -> tuple[Level, ...]:
        """Eigenvalues of the transfer matrix of a single point, λ₁ first: multiplicities, complex pairs, Jordan blocks.

        Raises
        ------
        NotApplicable
            For a batch; take one point with ``point.pick(i)``, or `gaps` for all.
        """
        return levels(self.laws, self.point, k)

    def error_bound(self, quantity: str) -> np.ndarray:
        """Bound on the numerical error of a quantity that is a derivative of f, per point.

        From an evaluation with longer numbers, which takes about a millisecond per point;
        above 40 joint states of the cut (100 with python-flint), from rounding as it is propagated.

        Parameters
        ----------
        quantity : str
            Such as ``"specific_heat"`` or ``"susceptibility(m)"``.

        Examples
        --------
        >>> from tmsolve import models, solve
        >>> r = solve(models.load("ising").chain.at(T="0.02", J=1, h=0))
        >>> bool(r.error_bound("entropy") < 1e-14 * r.entropy)          # s = 3.76e-42
        True
        """
        parsed = parse_quantity(quantity, self.point.chain)
        if parsed.name not in DIFFERENTIABLE:
            raise NotApplicable(f"bounds are given for {listing(DIFFERENTIABLE)}, not for {parsed}")
        bounds = error_bounds(self.laws, series_of(parsed, self.point.chain))
        return self._shaped(bounds, f"error bound of {parsed}")

    @property
    def log_eigenvalue(self) -> np.ndarray:
        """Logarithm of the largest eigenvalue, ln λ₁ = −f/T."""
        if (np.asarray(self.point.T) == 0).any():
            raise NotApplicable("at T = 0 the largest eigenvalue has no finite logarithm")
        return np.asarray(-self.free_energy / self.point.T)[()]

    @property
    def notes(self) -> tuple[str, ...]:
        """Reservations about some points, in words: limits at T = 0, near ties of ground states."""
        return self.laws.notes

    @property
    def diagnostics(self) -> Mapping[str, Any]:
        """How the numbers were obtained: matrix size, per point length of numbers, whose, why, and rounding bound."""
        facts = diagnose(self.laws)
        shaped = {n: facts[n].reshape(self.shape)[()] for n in ("bits", "arithmetic", "reason", "vector_error")}
        return {**facts, **shaped}
