"""How many sweeps a simulation needs to forget: integrated autocorrelation times."""

from __future__ import annotations

import numpy as np

__all__ = ["autocorrelation_time"]

#: The sum is cut off once it is longer than this many autocorrelation times.
_WINDOW = 6.0


def autocorrelation_time(series: np.ndarray) -> float:
    """Return τ = 1/2 + Σ_t ρ(t) of a stationary series, in steps of the series.

    The sum ends at the first M ≥ 6 τ(M), a compromise between bias and noise: A. D. Sokal,
    "Monte Carlo methods in statistical mechanics: foundations and new algorithms", in
    Functional Integration, NATO ASI Series B 361 (1997), section 3; from memory. The mean
    that is subtracted is that of all replicas together, so that replicas which stay apart
    show as a long time.

    Parameters
    ----------
    series : ndarray, shape (steps, replicas)
        Records of one quantity.

    Returns
    -------
    float
        1/2 for independent records; infinite for a series that never changes, or is not finite.

    Examples
    --------
    >>> rng = np.random.default_rng(1)
    >>> bool(abs(autocorrelation_time(rng.random((4000, 8))) - 0.5) < 0.05)
    True
    """
    steps = len(series)
    if not np.isfinite(series).all() or not (series != series[0, 0]).any():
        return float("inf")
    centred = series - series.mean()
    size = 1 << (2 * steps - 1).bit_length()
    power = np.zeros(size // 2 + 1)
    for column in centred.T:  # one replica at a time: their transforms together may not fit into memory
        power += np.abs(np.fft.rfft(column, size)) ** 2
    covariance = np.fft.irfft(power, size)[:steps] / np.arange(steps, 0, -1)
    tau = np.cumsum(covariance / covariance[0]) - 0.5
    beyond = np.flatnonzero(np.arange(steps) >= _WINDOW * tau)
    # Where the sum has not ended within the series, its largest value is a lower bound.
    found = float(tau[beyond[0]]) if len(beyond) else float(tau.max())
    return max(found, 0.0)
