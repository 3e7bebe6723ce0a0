"""Where does an anisotropic chain magnet switch? A crossover study of an invented compound.

Everything here is invented. The spins (S = 1) of the imagined compound "velmarite B" gain J
where neighbours are parallel and pay D whenever they are not in their middle state. At T = 0
the chain is ordered for D < J and empty of moments for D > J; at T > 0 there is no
transition, only crossovers. The study locates them as roots of exact derivatives, tells by
their width which one becomes a change of ground state, and draws the map.

Run it with the name of the picture to write: ``python crossover_study.py map.png``.
"""

import sys

import numpy as np

from tmsolve import Chain, bond, crossovers, scan, site, spins
from tmsolve.plotting import plot_map, save_figure

chain = Chain(
    spins(1),
    [bond(lambda s, t, J: -J * s * t), site(lambda s, D, h: D * s * s - h * s)],
    observables={"m": lambda s: s, "q": lambda s: s * s},
    name="velmarite B (invented)",
)


def main(picture: str = "crossover_study.png") -> None:
    """Locate, tabulate and draw."""
    magnet = chain.fix(J=1, h=0)

    print("half-way point of <s^2> along D: location and width shrink to a change of ground state at D = J")
    print("     T             D*         +-        width     T ln 2cosh(J/T)")
    across = {}
    for T in ("0.1", "0.2", "0.4", "0.6", "0.8", "1"):
        across[float(T)] = crossovers(magnet.fix(T=T), along="D", between=(0.3, 2))
        half = next(event for event in across[float(T)] if event.kind == "half-way of q")
        known = float(T) * np.log(2 * np.cosh(1 / float(T)))
        print(f"{float(T):6.2f} {half.location:16.12f} {half.error:8.0e} {half.width:12.5f} {known:16.12f}")

    print()
    print("crossovers along T at D = 0.9: analytic, their width is that of the temperature itself")
    for event in crossovers(magnet.fix(D="0.9"), along="T", between=(0.05, 3)):
        print(" ", event)

    grid = scan(
        magnet, axes={"D": np.linspace(0.3, 2, 86), "T": np.linspace(0.08, 1.2, 57)}, read=["specific_heat", "mean(q)"]
    )
    # The half-way line is steep, so it takes more values of D where it runs.
    values = np.union1d(np.round(np.linspace(0.3, 2, 35), 3), np.round(np.linspace(1, 1.22, 45), 3))
    lines = {
        float(D): crossovers(magnet.fix(D=str(D)), along="T", between=(0.08, 1.2), watch=["specific_heat", "mean(q)"])
        for D in values
    }
    axes = plot_map(grid, "specific_heat", x="D", y="T", events=lines)
    axes.set_title("velmarite B (invented), J = 1")
    save_figure(axes.figure, picture)
    print()
    print(f"map of {grid['specific_heat'].size} points with crossover lines written to {picture}")


if __name__ == "__main__":
    main(*sys.argv[1:2])
