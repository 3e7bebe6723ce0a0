"""A chain written from scratch: an invented chain magnet with two kinds of ions.

Everything here is invented. "Velmarite" stands for a chain of heavy ions (spin 1, with a
single-ion anisotropy D) bridged by pairs of light ions (spin 1/2) that are also coupled to
each other. The energies are in kelvin, as is the temperature:

    E = Σ_n [ −J (S_n + S_{n+1}) (a_n + b_n) + K a_n b_n + D S_n² − g h (S_n + a_n + b_n) ]

The question of the imagined chemist: does T·χ fall or rise on cooling, and where does the
pair of light ions give up its own order?
"""

from tmsolve import Chain, bond, crossovers, describe, site, solve, spins

# The cell: one heavy ion S and the two light ions a, b that bridge it to the next one.
chain = Chain(
    {"S": spins(1), "a": spins("1/2"), "b": spins("1/2")},
    [
        bond(lambda s, a, J: -J * s * a, ("S", "a"), shift=0),
        bond(lambda s, b, J: -J * s * b, ("S", "b"), shift=0),
        bond(lambda a, s, J: -J * a * s, ("a", "S"), shift=1),
        bond(lambda b, s, J: -J * b * s, ("b", "S"), shift=1),
        bond(lambda a, b, K: K * a * b, ("a", "b"), shift=0),
        site(lambda s, D: D * s * s, "S"),
        site(lambda s, g, h: -g * h * s),
    ],
    observables={
        "m": lambda s: s,  # summed over the whole cell
        "pair": bond(lambda a, b: a * b, ("a", "b"), shift=0),
    },
    name="velmarite (invented)",
)


def main() -> None:
    """Describe the chain, print its response at a few temperatures, and locate its crossovers."""
    print(describe(chain))
    print()

    magnet = chain.fix(J=14, K=20, D="-3.5", g=2, h=0)
    temperatures = [2, 4, 8, 16, 32, 64, 128]
    r = solve(magnet.at(T=temperatures))
    print("  T [K]     s [k_B]      c [k_B]      T*chi      <a b>     xi [cells]")
    for row in zip(
        temperatures,
        r.entropy,
        r.specific_heat,
        r.temperature_susceptibility("m"),
        r.mean("pair"),
        r.correlation_length("m"),
        strict=True,
    ):
        print("{:7.0f} {:11.6f} {:12.6f} {:10.4f} {:10.6f} {:14.6g}".format(*row))
    print()

    print("What changes between 1 K and 100 K, located as roots of exact derivatives:")
    for event in crossovers(magnet, along="T", between=(1, 100)):
        print(" ", event)


if __name__ == "__main__":
    main()
