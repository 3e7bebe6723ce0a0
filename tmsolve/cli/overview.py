"""What ``tmsolve --help`` prints."""

from __future__ import annotations

__all__ = ["COMMANDS", "overview"]

#: Command -> what it is for, in one line.
COMMANDS = {
    "solve": "thermodynamics, correlations and eigenvalues at one point",
    "derive": "closed forms: eigenvalues, partition function, free energy, as formulas",
    "scan": "any quantities over a grid of parameters, as table, file and figure",
    "crossovers": "where behaviour changes: maxima, half-way points, disorder points",
    "ground": "ground states at T = 0, residual entropies, phase diagrams; exact",
    "finite": "rings and open chains of N cells: partition function, profiles, distributions",
    "sample": "exact random configurations; single-site simulations beside exact results",
    "disorder": "averages over random parameters: fields, bonds, dilution; with error bars",
    "models": "the shipped models; with a name, what that model declares",
}

_AFTER = """\
MODEL is a shipped name such as potts, or the path of a Python file of your own, ending in .py.
Parameters that are not given with -p are taken from the DEFAULTS of the model; the output says so.
k_B = 1: temperatures and energies are in the same unit, that of the model's couplings.

examples:
  tmsolve models
  tmsolve solve blume_capel -p T=0.4 -p D=0.9
  tmsolve derive potts --option q=3 -p h=0
  tmsolve scan blume_capel --axis T=0.05:2:40 --read specific_heat,"susceptibility(m)" --plot c.png
  tmsolve crossovers ising --along T=0.1:5
  tmsolve ground spin1_nnn --axes J2,D --plot phases.png

exit codes:
  0 done   1 failed   2 the command line or the model cannot be used   3 some points failed
  130 interrupted (what was finished is written)   141 the reader of the output has gone
"""


def overview() -> str:
    """Return the help of the program as a whole."""
    width = max(map(len, COMMANDS))
    commands = "".join(f"  {name:{width}}  {text}\n" for name, text in COMMANDS.items())
    return (
        "usage: tmsolve COMMAND MODEL [options]\n"
        "       tmsolve COMMAND --help\n\n"
        "Solve classical chain models by transfer matrices.\n\n"
        f"commands:\n{commands}\noptions:\n"
        f"  {'-h, --help':{width}}  this text; after a command, its options and examples\n"
        f"  {'--version':{width}}  the version of tmsolve\n\n" + _AFTER
    )
