"""Exact series at high and low temperature, and limits."""
