"""Figures of grids, gap spectra and events (extra ``plot``); functions return Axes and show nothing."""

from .events import plot_events
from .files import check_figure_path, save_figure
from .gaps import plot_gaps
from .lines import plot_lines
from .maps import plot_map
from .phases import plot_phases

__all__ = ["check_figure_path", "plot_events", "plot_gaps", "plot_lines", "plot_map", "plot_phases", "save_figure"]
