"""What does a simulated field ramp show that the exact curve does not? Uniform and random fields compared.

Everything here is invented. The chains of the imagined compound "velmarite C" carry spins
±1 with coupling J = 1, which is the unit of energy here; a ramp of the field h is recorded at
T = 0.5, once in a clean crystal and once in one whose impurities add a random field to every
cell: with mean 0, and with its opposite half a ring further on, so that neither direction is
preferred.

Three facts (common practice, no source) against which simulations can be held:

* a chain with short couplings has no magnetisation at h = 0 for any T > 0;
* the range of fields in which it is saturated grows with J;
* random fields round the curve.

A simulation by single spins that starts aligned shows a magnetisation at h = 0 all the
same. The last part says why: the chain is not much longer than its correlation length, so
that at any moment nearly all of it points one way, and the run is too short to turn it over.

Run it with the name of the picture to write: ``python field_ramp.py ramp.png``.
"""

import sys

import numpy as np

from tmsolve import Chain, bond, ising, metropolis, realisation, sample, site, solve
from tmsolve.plotting import save_figure

chain = Chain(
    ising(),
    [bond(lambda s, t, J: -J * s * t), site(lambda s, h: -h * s)],
    observables={"m": lambda s: s},
    name="velmarite C (invented)",
)
T, CELLS, SWEEPS = "0.5", 64, 150
RAMP = ["0", "0.03", "0.1", "0.25", "0.5", "0.8", "1.2", "1.6"]
RANDOM, CLEAN = "#D55E00", {0.25: "#9ecae1", 0.5: "#4292c6", 1.0: "#08519c"}


def main(picture: str = "field_ramp.png") -> None:
    """Tabulate, diagnose and draw."""
    rng = np.random.default_rng(2026)
    noise = rng.normal(0, 1, 2 * CELLS)
    noise = np.concatenate([noise, -noise])  # the same mean field in both crystals
    rows, runs = [], {}
    print("     h    exact          simulated   random fields: exact          simulated")
    for h in RAMP:
        point, fields = chain.at(J=1, h=h, T=T), {"h": float(h) + noise}
        exact, random = float(solve(point).mean("m")), shaken(float(h), noise)
        run = metropolis(point, CELLS, SWEEPS, start="cold", rng=rng)
        disturbed = metropolis(point, len(noise), SWEEPS, start="cold", rng=rng, realisation=fields)
        runs[h] = run
        rows.append((float(h), run.mean("m"), disturbed.mean("m")))
        print(f"{float(h):6.2f} {exact:8.4f} {run.mean('m')!s:>18} {random:21.4f} {disturbed.mean('m')!s:>18}")
    print("(± inf: the run never left its start, so its scatter says nothing)\n")
    for J in CLEAN:
        print(f"J = {J:4.2f}: m reaches 0.9 at h = {saturation(J):.4f}")
    print()
    found = runs["0"].diagnose("m")
    print("the simulated chain at h = 0:", found, sep="\n")
    drawn = sample(chain.at(J=1, h=0, T=T), CELLS, 20000, rng=rng)
    print(f"exact samples at h = 0, N = {CELLS}: m = {drawn.mean('m')}")
    draw(picture, rows, runs["0"], found, noise)
    print(f"picture written to {picture}")


def shaken(h: float, noise: np.ndarray) -> float:
    """Return the exact magnetisation of the ring with random fields."""
    return realisation(chain.fix(J=1, T=T), {"h": h + noise}, "ring").mean("m")


def saturation(J: float) -> float:
    """Return the field at which m of the clean crystal is 0.9: sinh(h/T) = 0.9/√(1 − 0.9²) · exp(−2J/T)."""
    fields = np.linspace(0, 2, 4001)
    m = solve(chain.at(J=J, h=fields, T=T)).mean("m")
    return float(np.interp(0.9, m, fields))


def draw(picture, rows, run, found, noise) -> None:
    """Draw the ramps, what they look like near h = 0, and the distribution of the magnetisation there."""
    from matplotlib import pyplot

    figure, (left, middle, right) = pyplot.subplots(1, 3, figsize=(11.4, 3.6), layout="constrained")
    ramps(left, np.linspace(0, 1.65, 331), np.linspace(0, 1.65, 34), noise)
    points(left, rows)
    left.set(xlim=(-0.05, 1.7), ylim=(-0.03, 1.05), title="field ramp at T = 0.5 [energy]")
    left.legend(frameon=False, fontsize=7, loc="lower right")
    ramps(middle, np.linspace(-0.12, 0.12, 241), np.linspace(-0.12, 0.12, 13), noise)
    points(middle, [row for row in rows if row[0] < 0.12])
    middle.axhline(0, color="0.7", lw=0.6, zorder=0)
    middle.axvline(0, color="0.7", lw=0.6, zorder=0)
    middle.annotate("exact: m = 0 at h = 0", (0, 0), (0.012, -0.45), fontsize=8, arrowprops={"arrowstyle": "->"})
    text = "simulated from an\naligned start"
    middle.annotate(text, (0, rows[0][1].value), (-0.115, 0.62), fontsize=8, arrowprops={"arrowstyle": "->"})
    middle.set(xlim=(-0.12, 0.12), ylim=(-1.08, 1.08), title="the same near h = 0")
    for ax in (left, middle):
        ax.set(xlabel="field h [energy]", ylabel="magnetisation m per spin")
    distribution(right, run, found)
    for ax in (left, middle, right):
        ax.title.set_fontsize(9)
    figure.suptitle("velmarite C (invented)", fontsize=10)
    save_figure(figure, picture)


def ramps(ax, fields, coarse, noise) -> None:
    """Draw the exact curves."""
    for J, shade in CLEAN.items():
        ax.plot(fields, solve(chain.at(J=J, h=fields, T=T)).mean("m"), color=shade, label=f"exact, J = {J:g}")
    ax.plot(coarse, [shaken(h, noise) for h in coarse], color=RANDOM, ls="--", label="exact, J = 1, random fields")


def points(ax, rows) -> None:
    """Draw the simulated points, without a bar where a run that never left its start has none."""
    looks = ((CLEAN[1.0], "o", "simulated, J = 1"), (RANDOM, "s", "simulated, J = 1, random fields"))
    for column, (colour, marker, label) in enumerate(looks, start=1):
        means = [row[column] for row in rows]
        bars = [mean.error if np.isfinite(mean.error) else 0 for mean in means]
        look = {"fmt": marker, "color": colour, "mfc": "white", "ms": 4.5, "capsize": 2, "label": label}
        ax.errorbar([row[0] for row in rows], [mean.value for mean in means], bars, **look)


def distribution(ax, run, found) -> None:
    """Draw how the magnetisation of the simulated chain is distributed at h = 0, and how it was in the run."""
    m, chance = found.totals.values / found.cells, found.totals.probabilities
    edges = np.append(m - 1 / found.cells, m[-1] + 1 / found.cells)
    seen, _ = np.histogram(run.series["m"][run.discard :] / found.cells, edges)
    ax.bar(m, seen / seen.sum(), 2 / found.cells, color="#bdbdbd", label=f"simulated, {SWEEPS} sweeps")
    ax.plot(m, chance, color=CLEAN[1.0], label=f"exact, N = {found.cells}")
    for x, text in ((found.exact, "⟨m⟩"), (found.exact_absolute, "⟨|m|⟩")):
        ax.axvline(x, ymax=0.7, color=CLEAN[1.0], lw=0.8, ls=":")
        ax.annotate(f"exact\n{text}", (x, 0.25), ha="center", fontsize=8, backgroundcolor="white")
    ax.set(xlabel="m of one chain, J = 1, h = 0", ylabel="probability", yscale="log", ylim=(1e-4, 4))
    ax.set_xticks([-1, -0.5, 0, 0.5, 1])
    ax.set_title(f"why: N/ξ is only {found.lengths:.1f} at h = 0")
    ax.legend(frameon=False, fontsize=7, loc="upper left", ncols=2)


if __name__ == "__main__":
    main(*sys.argv[1:2])
