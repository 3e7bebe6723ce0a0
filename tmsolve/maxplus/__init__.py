"""Optimal cycle means and potentials of weighted directed graphs."""
