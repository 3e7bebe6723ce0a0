"""From a Hamiltonian on paper to a partition function: an invented adsorbed row.

Everything here is invented. Along a step edge of an imagined crystal, each site is empty
(0) or holds a flat molecule that points up-row (+1) or down-row (−1). Neighbours that point
the same way gain w, neighbours that point at each other or away lose w, and a molecule
costs −mu:

    E = Σ_n [ −w σ_n σ_{n+1} − mu σ_n² ],   σ = −1, 0, +1.

The closed form is derived, used, and compared with the numerical solver.
"""

import sympy

from tmsolve import Chain, bond, closed_form, ring, site, solve, spins

row = Chain(
    spins(1),
    [bond(lambda s, t, w: -w * s * t), site(lambda s, mu: -mu * s * s)],
    observables={"coverage": lambda s: s * s},
    name="adsorbed row (invented)",
)


def main() -> None:
    """Derive Z_N, f and the coverage, then check them at one point."""
    form = closed_form(row)
    print(form)
    print()

    coverage = form.mean("coverage")
    print("coverage =", coverage)
    print()

    # The same numbers without the formula.
    values = {"w": sympy.Rational(3, 2), "mu": sympy.Rational(-1, 4), "beta": sympy.Rational(5, 4)}
    at = {symbol: values[symbol.name] for symbol in coverage.free_symbols}
    point = row.at(T="4/5", w="3/2", mu="-1/4")
    print(f"coverage by formula {float(coverage.subs(at)):.15f}")
    print(f"coverage by solver  {float(solve(point).mean('coverage')):.15f}")
    twelve = form.partition_function(12)
    exact = twelve.subs({symbol: values[symbol.name] for symbol in twelve.free_symbols})
    by_formula, by_products = float(sympy.log(exact)), float(ring(point, 12).log_Z)
    print(f"ln Z of a ring of 12 by formula {by_formula:.12f}, by products {by_products:.12f}")


if __name__ == "__main__":
    main()
