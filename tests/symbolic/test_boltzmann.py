"""Boltzmann factors as monomials, and the alphabet of symbols for them."""

from __future__ import annotations

from fractions import Fraction

import sympy as sp

from tmsolve.symbolic.alphabet import Alphabet, common_measure
from tmsolve.symbolic.boltzmann import boltzmann_terms, multiply, polynomial_terms

beta = sp.Symbol("beta", positive=True)
J, D, w = sp.symbols("J D w", real=True)


def back(terms):
    """Write a sum of monomials as an ordinary expression."""
    return sp.Add(
        *(
            sp.Rational(c.numerator, c.denominator)
            * sp.Mul(*(sp.exp(sp.Rational(e.numerator, e.denominator) * key) for key, e in monomial))
            for monomial, c in terms.items()
        )
    )


def test_an_energy_is_one_monomial():
    terms = boltzmann_terms(-J / 2 + D, beta)
    assert list(terms.values()) == [1] and len(next(iter(terms))) == 2
    assert back(terms) == sp.exp(beta * J / 2) * sp.exp(-beta * D)


def test_a_forbidden_configuration_is_zero():
    assert boltzmann_terms(sp.oo, beta) == {}


def test_energies_that_are_not_affine_stay_exact():
    terms = boltzmann_terms(-(J**2) * D / 3 - sp.sqrt(5) * J - J, beta)
    assert {key for key, _ in next(iter(terms))} == {beta * J**2 * D, sp.sqrt(5) * beta * J, beta * J}


def test_energies_with_the_temperature_give_their_weight():
    assert boltzmann_terms(-sp.log(4) / beta + J, beta) == multiply(
        {frozenset(): Fraction(4)}, boltzmann_terms(J, beta)
    )
    assert back(boltzmann_terms(-sp.log(sp.exp(beta * J) + 2) / beta, beta)) == sp.exp(beta * J) + 2
    half = boltzmann_terms(-3 * sp.log(2) / beta / 2, beta)
    assert sp.simplify(back(half) - 2 * sp.sqrt(2)) == 0


def test_weights_are_polynomials():
    assert sp.expand(back(polynomial_terms((1 + w) ** 2 * sp.exp(-beta * J)))) == sp.expand(
        (1 + w) ** 2 * sp.exp(-beta * J)
    )
    assert polynomial_terms(sp.Integer(0)) == {}
    assert len(polynomial_terms(1 / (1 + w))) == 1


def test_the_units_are_the_largest_that_make_exponents_whole():
    terms = [boltzmann_terms(-J * s * t, beta) for s in (-1, 1) for t in (sp.Rational(3, 4), sp.Rational(1, 2))]
    alphabet = Alphabet.of(terms)
    assert alphabet.classes == (beta * J,) and alphabet.units == (Fraction(1, 4),)
    assert common_measure([Fraction(2), Fraction(-4)]) == 2
    assert common_measure([]) == 0


def test_there_and_back():
    terms = [boltzmann_terms(-J * s + D * s * s, beta) for s in (-1, 0, 1)]
    alphabet = Alphabet.of(terms)
    scale = alphabet.scale(terms)
    for each in terms:
        element = alphabet.element(each, scale)
        assert all(p >= 0 for powers, _ in element.terms() for p in powers)
        laurent = alphabet.laurent(element, scale)
        expected = {tuple(dict(m).get(key, Fraction(0)) for key in alphabet.classes): c for m, c in each.items()}
        assert laurent == expected


def test_an_alphabet_without_classes():
    terms = [{frozenset(): Fraction(2)}]
    alphabet = Alphabet.of(terms)
    element = alphabet.element(terms[0], alphabet.scale(terms))
    assert element == 2 and alphabet.laurent(element, (0,)) == {(): Fraction(2)}
