"""Running commands inside the test process, and model files to run them on."""

import json
from dataclasses import dataclass

import pytest

from tmsolve.cli import main

# An invented chain with two local energies and a bond: two spins of different length would be "a" and "b".
PAIR = '''"""Invented pair chain.

E = sum_i [ -J s_i t_i - K t_i s_{i+1} - h (s_i + t_i) ],  s = -1, +1,  t = -1, 0, +1
"""

from tmsolve import Chain, bond, ising, site, spins


def chain(length: int = 1, label: str = "plain"):
    return Chain(
        {"s": ising(), "t": spins(length)},
        [
            bond(lambda s, t, J: -J*s*t, ("s", "t"), shift=0),
            bond(lambda t, s, K=1: -K*s*t, ("t", "s")),
            site(lambda s, h: -h*s),
        ],
        observables={"m": lambda s: s},
        name=f"invented {label} pair chain",
    )


DEFAULTS = {"J": "0.5", "T": 1}
'''


@dataclass
class Ended:
    """What a command printed and how it ended."""

    code: int
    out: str
    err: str

    @property
    def json(self):
        return json.loads(self.out)


@pytest.fixture
def tm(capsys):
    """Run ``tmsolve WORDS`` in this process."""

    def run(*words):
        capsys.readouterr()
        code = main([str(word) for word in words])
        captured = capsys.readouterr()
        return Ended(code, captured.out, captured.err)

    return run


@pytest.fixture
def pair(tmp_path):
    """The path of a model file with options and some defaults."""
    path = tmp_path / "pair.py"
    path.write_text(PAIR, encoding="utf-8")
    return path


@pytest.fixture
def write(tmp_path):
    """Write a model file and return its path."""

    def writer(text, name="own.py"):
        path = tmp_path / name
        path.write_text(text, encoding="utf-8")
        return path

    return writer
