"""Long numbers by python-flint agree with those by mpmath, and leave flint's own settings alone."""

import threading
from fractions import Fraction

import mpmath
import numpy as np
import pytest

from tmsolve.operators import midpoints as room
from tmsolve.operators.midpoints import long_numbers, midpoints
from tmsolve.operators.numbers import multiprecision, to_double

flint = pytest.importorskip("flint")

EVERYWHERE = ("inf", "0", "1", "1e-30", "3.5", "1e9", "1e400")
DOMAINS = {
    "exp": ("-inf", "-1e18", "-0.5", "1e-30", "0", "3.5", "1e9", "inf"),
    "expm1": ("-inf", "-1e18", "-1e-12", "-1e-400", "0", "3.5", "inf"),
    "log": EVERYWHERE,
    "log1p": (*EVERYWHERE, "-1e-12", "-0.5"),
}


def read(numbers, text):
    return numbers.scalar(text if "inf" in text else Fraction(text))


@pytest.mark.parametrize("bits", [64, 200, 1024])
@pytest.mark.parametrize(("name", "text"), [(n, t) for n, texts in DOMAINS.items() for t in texts])
def test_functions_agree_to_the_last_bits(bits, name, text):
    long, fast = multiprecision(bits), midpoints(bits, flint)
    expected = getattr(long, name)(read(long, text))
    with fast.working():
        found = long.scalar(getattr(fast, name)(read(fast, text)))
    assert found == expected or abs(found - expected) <= abs(expected) * mpmath.ldexp(1, 4 - bits)


@pytest.mark.parametrize("value", [3, -7, 0.1, np.float64(0.25), np.int64(5), True, Fraction(1, 3), mpmath.mpf("0.3")])
def test_values_are_taken_in_alike(value):
    long, fast = multiprecision(128), midpoints(128, flint)
    with fast.working():
        found = long.scalar(fast.scalar(value))
    assert abs(found - long.scalar(value)) <= abs(found) * mpmath.ldexp(1, -127)


def test_exponents_beyond_all_measure():
    with midpoints(128, flint).working() as _:
        tiny = multiprecision(128).scalar(midpoints(128, flint).exp(midpoints(128, flint).scalar(-(2**100))))
    assert abs(mpmath.log(tiny) / -(2**100) - 1) < 1e-15


def test_rounding_stays_below_the_unit_that_is_stated():
    fast = midpoints(64, flint)
    with fast.working():
        for k in range(1, 200):
            quotient = Fraction(*fast.scalar(Fraction(k, 7)).as_integer_ratio())
            assert abs(quotient * 7 / k - 1) <= Fraction(*fast.epsilon.as_integer_ratio())


@pytest.mark.parametrize("text", ["inf", "-inf", "nan"])
def test_what_is_not_finite_goes_both_ways(text):
    long, fast = multiprecision(128), midpoints(128, flint)
    with fast.working():
        back = long.scalar(fast.scalar(long.scalar(text)))
    assert str(back) == str(long.scalar(text))


def test_beyond_doubles_is_infinite():
    fast = midpoints(128, flint)
    with fast.working():
        assert to_double(fast.power_of_two(np.array([2000, -2000, 3]))).tolist() == [np.inf, 0, 8]
        assert to_double(-fast.power_of_two(np.array([10**30]))).tolist() == [-np.inf]
        largest = np.finfo(float).max
        assert to_double(fast.array([largest, -largest])).tolist() == [largest, -largest]


def test_a_length_is_restored_also_after_an_error():
    before = flint.ctx.prec
    with pytest.raises(ZeroDivisionError), midpoints(300, flint).working():
        assert flint.ctx.prec == 300
        with midpoints(128, flint).working():
            assert flint.ctx.prec == 128
        assert flint.ctx.prec == 300
        raise ZeroDivisionError
    assert flint.ctx.prec == before


def test_threads_do_not_share_a_length():
    wrong = []

    def work(bits):
        fast = midpoints(bits, flint)
        for _ in range(200):
            with fast.working():
                third = fast.scalar(1) / 3
                wrong.extend([bits] if flint.ctx.prec != bits else [])
                off = abs(multiprecision(2 * bits).scalar(third) * 3 - 1)
                wrong.extend([off] if not off < mpmath.ldexp(1, 2 - bits) else [])

    threads = [threading.Thread(target=work, args=(bits,)) for bits in (128, 700, 256)]
    for thread in threads:
        thread.start()
    for thread in threads:
        thread.join()
    assert not wrong


def test_without_flint_numbers_are_mpmaths(monkeypatch):
    assert long_numbers(128).arithmetic == "python-flint"
    monkeypatch.setattr(room, "flint_module", lambda: None)
    assert long_numbers(128) is multiprecision(128)
