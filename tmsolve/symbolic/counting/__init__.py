"""Exact numbers of configurations, generating functions, and zeros of partition functions."""
