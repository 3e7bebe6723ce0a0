"""Quenched and annealed disorder: random parameters, averages with error bars, exact averages where they exist."""
