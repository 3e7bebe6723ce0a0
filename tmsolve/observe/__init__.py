"""Thermodynamics, derivatives and correlations of the infinite chain at T > 0."""
