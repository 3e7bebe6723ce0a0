"""Rings and open chains of N cells."""
