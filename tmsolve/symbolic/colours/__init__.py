"""Closed forms for a symbolic number of colours: sums over patterns, sectors of marked colours."""
