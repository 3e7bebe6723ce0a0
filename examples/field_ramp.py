"""What does a simulated field ramp show that the exact curve does not? Uniform and random fields compared.

Everything here is invented. The chains of the imagined compound "velmarite C" carry spins
±1 with coupling J; a ramp of the field h is recorded at T = 0.5 J, once in a clean crystal
and once in one whose impurities add a random field to every cell: with mean 0, and with its
opposite in another cell.

Three facts (common practice, no source) against which simulations can be held:

* a chain with short couplings has no magnetisation at h = 0 for any T > 0;
* the range of fields in which it is saturated grows with J;
* random fields round the curve.

A simulation by single spins that starts aligned shows a magnetisation at h = 0 all the
same. The last part says why: the chain is not longer than its correlation length, so that
at any moment nearly all of it points one way, and the run is too short to turn it over.

Run it with the name of the picture to write: ``python field_ramp.py ramp.png``.
"""

import sys

import numpy as np

from tmsolve import Chain, bond, ising, metropolis, sample, site, solve
from tmsolve.plotting import save_figure

chain = Chain(
    ising(),
    [bond(lambda s, t, J: -J * s * t), site(lambda s, h: -h * s)],
    observables={"m": lambda s: s},
    name="velmarite C (invented)",
)
T, CELLS, SWEEPS = "0.5", 64, 150
RAMP = ["0", "0.03", "0.1", "0.25", "0.5", "0.8", "1.2", "1.6"]


def main(picture: str = "field_ramp.png") -> None:
    """Tabulate, diagnose and draw."""
    rng = np.random.default_rng(2026)
    noise = rng.normal(0, 1, 4 * CELLS)
    noise = rng.permutation(np.concatenate([noise, -noise]))  # the same mean field in both crystals
    rows, runs = [], {}
    print("     h    exact          simulated   random fields: exact          simulated")
    for h in RAMP:
        point, fields = chain.at(J=1, h=h, T=T), {"h": float(h) + noise}
        exact = float(solve(point).mean("m"))
        run = metropolis(point, CELLS, SWEEPS, start="cold", rng=rng)
        random = sample(point, len(noise), 1000, rng=rng, realisation=fields).mean("m")
        shaken = metropolis(point, len(noise), SWEEPS, start="cold", rng=rng, realisation=fields)
        runs[h] = run
        rows.append((float(h), exact, run.mean("m"), random, shaken.mean("m")))
        print(f"{float(h):6.2f} {exact:8.4f} {run.mean('m')!s:>18} {random!s:>22} {shaken.mean('m')!s:>18}")
    print()
    reached = {J: saturation(J) for J in (0.25, 0.5, 1.0)}
    for J, h in reached.items():
        print(f"J = {J:4.2f}: m reaches 0.9 at h = {h:.4f}")
    print()
    found = runs["0"].diagnose("m")
    print("the simulated chain at h = 0:", found, sep="\n")
    drawn = sample(chain.at(J=1, h=0, T=T), CELLS, 20000, rng=rng)
    print(f"exact samples at h = 0, N = {CELLS}: m = {drawn.mean('m')}")
    dense = np.linspace(0, 1.65, 34)
    rounded = [
        sample(chain.at(J=1, h=0, T=T), len(noise), 400, rng=rng, realisation={"h": h + noise}).mean("m").value
        for h in dense
    ]
    draw(picture, rows, runs["0"], found, (dense, rounded))
    print(f"picture written to {picture}")


def saturation(J: float) -> float:
    """Return the field at which m of the clean crystal is 0.9: sinh(h/T) = 0.9/√(1 − 0.9²) · exp(−2J/T)."""
    fields = np.linspace(0, 2, 4001)
    m = solve(chain.at(J=J, h=fields, T=T)).mean("m")
    return float(np.interp(0.9, m, fields))


def draw(picture, rows, run, found, rounded) -> None:
    """Draw the ramps, and the distribution of the magnetisation at h = 0."""
    from matplotlib import pyplot

    figure, (left, right) = pyplot.subplots(1, 2, figsize=(8.4, 3.6), layout="constrained")
    fields = np.linspace(0, 1.65, 331)
    for J, shade in ((0.25, "#9ecae1"), (0.5, "#4292c6"), (1.0, "#08519c")):
        left.plot(fields, solve(chain.at(J=J, h=fields, T=T)).mean("m"), color=shade, label=f"exact, J = {J:g}")
    h = [row[0] for row in rows]
    left.plot(*rounded, color="#D55E00", ls="--", label="exact, random fields, J = 1")
    for column, colour, marker, label in (
        (2, "#08519c", "o", "simulated, J = 1 (exact: 0 at h = 0)"),
        (4, "#D55E00", "s", "simulated, random fields"),
    ):
        points = [row[column] for row in rows]
        # A run that never left its start has no error bar; the point is drawn without one.
        bars = [p.error if np.isfinite(p.error) else 0 for p in points]
        left.errorbar(
            h, [p.value for p in points], bars, fmt=marker, color=colour, mfc="white", ms=4.5, capsize=2, label=label
        )
    left.set(xlabel="field h / J", ylabel="magnetisation m", ylim=(-0.03, 1.05))
    left.set_title("velmarite C (invented), T = 0.5", fontsize=9)
    left.legend(frameon=False, fontsize=7, loc="lower right")
    m, chance = found.totals.values / found.cells, found.totals.probabilities
    edges = np.append(m - 1 / found.cells, m[-1] + 1 / found.cells)
    seen, _ = np.histogram(run.series["m"][run.discard :] / found.cells, edges)
    right.bar(m, seen / seen.sum(), 2 / found.cells, color="#bdbdbd", label=f"simulated, {SWEEPS} sweeps")
    right.plot(m, chance, color="#08519c", label=f"exact, N = {found.cells}")
    for x, text in ((found.exact, "⟨m⟩"), (found.exact_absolute, "⟨|m|⟩")):
        right.axvline(x, color="#08519c", lw=0.8, ls=":")
        right.annotate(text, (x, 0.4), ha="center", fontsize=8, backgroundcolor="white")
    right.set(xlabel="magnetisation of one chain at h = 0", ylabel="probability", yscale="log", ylim=(1e-4, 1))
    right.set_xticks([-1, -0.5, 0, 0.5, 1])
    right.set_title(f"N/ξ = {found.lengths:.2f}", fontsize=9)
    right.legend(frameon=False, fontsize=7, loc="upper left")
    save_figure(figure, picture)


if __name__ == "__main__":
    main(*sys.argv[1:2])
