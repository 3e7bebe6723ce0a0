"""Settings of the whole test suite."""

import os

from hypothesis import HealthCheck, settings

# Set before anything draws, and inherited by the programs that tests start.
os.environ.setdefault("MPLBACKEND", "Agg")

# On a build machine the same examples every time; at a desk new ones, so that they keep looking for faults.
_COMMON = {"deadline": None, "print_blob": True, "suppress_health_check": [HealthCheck.too_slow]}
settings.register_profile("desk", **_COMMON)
settings.register_profile("ci", derandomize=True, **_COMMON)
settings.load_profile("ci" if os.environ.get("CI") else "desk")
