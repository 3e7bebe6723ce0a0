"""Decimation: renormalised energies, recursion relations, fixed points and flows."""
