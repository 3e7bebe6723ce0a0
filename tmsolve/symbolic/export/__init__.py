"""Formulas for other programs: NumPy functions with their source, MathML."""
