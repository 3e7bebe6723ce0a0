"""The version of tmsolve: one number for the package, the command line and what results record."""

__version__ = "0.1.0"
