"""Rigorous enclosures: intervals that provably contain the free energy and the spectrum of a chain."""
