"""Permutation groups on 0 … n−1: what leaves a table of numbers unchanged, and what follows from it."""
