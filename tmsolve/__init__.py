"""Solve classical chain models by transfer matrices: closed forms, thermodynamics, crossovers.

Write the energy of a chain as plain functions of its local states, bind parameters, ask for results:

>>> from tmsolve import Chain, bond, ising, site, solve
>>> chain = Chain(ising(), [bond(lambda s, t, J: -J*s*t), site(lambda s, h: -h*s)])
>>> round(float(solve(chain.at(T=1, J=1, h=0)).free_energy), 12)
-1.126928011043

Names are loaded on first use, so that ``import tmsolve`` itself loads no numerical library.
"""

from __future__ import annotations

from importlib import import_module
from typing import TYPE_CHECKING, Any

from ._version import __version__

if TYPE_CHECKING:
    from . import errors as errors
    from . import models as models
    from .answer.exported import numpy_function as numpy_function
    from .answer.solve import solve as solve
    from .assemble.describe_chain import describe as describe
    from .declare import Chain as Chain
    from .declare import StateSet as StateSet
    from .declare import bond as bond
    from .declare import circle as circle
    from .declare import clock as clock
    from .declare import colours as colours
    from .declare import cos_turns as cos_turns
    from .declare import delta as delta
    from .declare import interval as interval
    from .declare import ising as ising
    from .declare import line as line
    from .declare import occupation as occupation
    from .declare import site as site
    from .declare import sphere as sphere
    from .declare import spins as spins
    from .declare import term as term
    from .declare import weight as weight
    from .disorder.annealed import annealed as annealed
    from .disorder.ground_energy import disordered_ground_state as disordered_ground_state
    from .disorder.quenched import quenched as quenched
    from .disorder.realised import realisation as realisation
    from .disorder.segments import segment_average as segment_average
    from .disorder.stationary import stationary_message as stationary_message
    from .draw.sampling import sample as sample
    from .draw.simulating import metropolis as metropolis
    from .enclose.certify_point import certify as certify
    from .errors import DeclarationError as DeclarationError
    from .errors import MissingExtra as MissingExtra
    from .errors import NotApplicable as NotApplicable
    from .errors import ParameterError as ParameterError
    from .errors import SolveError as SolveError
    from .errors import TmsolveError as TmsolveError
    from .errors import TooLargeError as TooLargeError
    from .finite.chains import open_chain as open_chain
    from .finite.chains import ring as ring
    from .finite.domains import domains as domains
    from .ground.phases import phase_diagram as phase_diagram
    from .ground.states import ground_state as ground_state
    from .survey.activation import local_slope as local_slope
    from .survey.axes import axis as axis
    from .survey.caloric import adiabatic_slope as adiabatic_slope
    from .survey.caloric import entropy_change as entropy_change
    from .survey.deviations import rate_function as rate_function
    from .survey.doubling import settled as settled
    from .survey.ensemble import field_for_mean as field_for_mean
    from .survey.events import crossovers as crossovers
    from .survey.information import fisher_information as fisher_information
    from .survey.isentropes import isentrope as isentrope
    from .survey.run import scan as scan
    from .symbolic.counting.counts import counts as counts
    from .symbolic.counting.generating import generating_function as generating_function
    from .symbolic.counting.limiting import limiting_curve as limiting_curve
    from .symbolic.counting.zeros import zeros as zeros
    from .symbolic.decimation.decimate import decimate as decimate
    from .symbolic.decimation.fixed_points import fixed_points as fixed_points
    from .symbolic.decimation.flow import flow as flow
    from .symbolic.decimation.recursion import recursion as recursion
    from .symbolic.expansion.limits import limits as limits
    from .symbolic.expansion.series import series as series
    from .symbolic.export.mathml import mathml as mathml
    from .symbolic.forms import closed_form as closed_form

_HOMES = {
    "answer.exported": ("numpy_function",),
    "answer.solve": ("solve",),
    "assemble.describe_chain": ("describe",),
    "declare": (
        "Chain", "StateSet", "bond", "circle", "clock", "colours", "cos_turns", "delta", "interval", "ising", "line",
        "occupation", "site", "sphere", "spins", "term", "weight",
    ),
    "disorder.annealed": ("annealed",),
    "disorder.ground_energy": ("disordered_ground_state",),
    "disorder.quenched": ("quenched",),
    "disorder.realised": ("realisation",),
    "disorder.segments": ("segment_average",),
    "disorder.stationary": ("stationary_message",),
    "draw.sampling": ("sample",),
    "draw.simulating": ("metropolis",),
    "enclose.certify_point": ("certify",),
    "errors": (
        "DeclarationError", "MissingExtra", "NotApplicable", "ParameterError", "SolveError", "TmsolveError",
        "TooLargeError",
    ),
    "finite.chains": ("open_chain", "ring"),
    "finite.domains": ("domains",),
    "ground.phases": ("phase_diagram",),
    "ground.states": ("ground_state",),
    "survey.activation": ("local_slope",),
    "survey.axes": ("axis",),
    "survey.caloric": ("adiabatic_slope", "entropy_change"),
    "survey.deviations": ("rate_function",),
    "survey.doubling": ("settled",),
    "survey.ensemble": ("field_for_mean",),
    "survey.events": ("crossovers",),
    "survey.information": ("fisher_information",),
    "survey.isentropes": ("isentrope",),
    "survey.run": ("scan",),
    "symbolic.counting.counts": ("counts",),
    "symbolic.counting.generating": ("generating_function",),
    "symbolic.counting.limiting": ("limiting_curve",),
    "symbolic.counting.zeros": ("zeros",),
    "symbolic.decimation.decimate": ("decimate",),
    "symbolic.decimation.fixed_points": ("fixed_points",),
    "symbolic.decimation.flow": ("flow",),
    "symbolic.decimation.recursion": ("recursion",),
    "symbolic.expansion.limits": ("limits",),
    "symbolic.expansion.series": ("series",),
    "symbolic.export.mathml": ("mathml",),
    "symbolic.forms": ("closed_form",),
}  # fmt: skip
_HOME_OF = {name: home for home, names in _HOMES.items() for name in names}
_ROOMS = ("errors", "models")

__all__ = ["__version__", *sorted(_HOME_OF)]


def __getattr__(name: str) -> Any:
    """Import the home of a front-door name on first use and keep the name."""
    if name in _ROOMS:
        return import_module(f".{name}", __name__)
    if name in _HOME_OF:
        value = getattr(import_module(f".{_HOME_OF[name]}", __name__), name)
        globals()[name] = value
        return value
    hint = ""
    if not name.startswith("_"):
        from .errors import did_you_mean

        hint = did_you_mean(name, sorted(_HOME_OF))
    raise AttributeError(f"module 'tmsolve' has no attribute '{name}'.{hint}")


def __dir__() -> list[str]:
    """List the front door together with what is loaded already."""
    return sorted({*globals(), *_HOME_OF, *_ROOMS})
