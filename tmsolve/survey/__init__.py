"""Scans over parameter grids and located crossovers: the verbs scan and crossovers."""
