"""Figures of grids, gap spectra, events, zeros and flows (extra ``plot``); functions return Axes and show nothing."""

from .events import plot_events
from .files import check_figure_path, save_figure
from .flows import plot_flow
from .gaps import plot_gaps
from .lines import plot_lines
from .maps import plot_map
from .phases import plot_phases
from .zeros import plot_zeros

__all__ = [
    "check_figure_path",
    "plot_events",
    "plot_flow",
    "plot_gaps",
    "plot_lines",
    "plot_map",
    "plot_phases",
    "plot_zeros",
    "save_figure",
]
