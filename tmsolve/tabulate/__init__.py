"""Calling the user's functions: numbers, Taylor numbers, exact numbers, symbols."""
