"""flint's length of numbers is one setting for all threads: whoever changes it waits for the others."""

from __future__ import annotations

import threading
from fractions import Fraction

import pytest

from tmsolve.enclose.balls import Balls
from tmsolve.operators.midpoints import long_numbers

flint = pytest.importorskip("flint")


@pytest.mark.parametrize("ask", ["exponential", "log_ends", "working"])
def test_balls_wait_for_numbers_of_another_thread(ask):
    balls, done = Balls(64), []

    def work():
        if ask == "exponential":
            done.append(balls.exponential(Fraction(1, 3)))
        elif ask == "log_ends":
            done.append(balls.log_ends((0, 1, 0, 1), (0, 1, 1, 1)))
        else:
            with balls.working():
                done.append(flint.ctx.prec)

    other = threading.Thread(target=work)
    with long_numbers(512).working():
        other.start()
        other.join(0.1)
        assert not done and flint.ctx.prec == 512
    other.join(10)
    assert len(done) == 1
    if ask == "working":
        assert done == [64]
