"""Settings that all tests share."""

from __future__ import annotations

import os

from hypothesis import settings

# ``EVENSTAGE_TESTS=deep pytest`` looks longer and at new examples each time. Otherwise a run is
# quick, and the same for everybody.
settings.register_profile("quick", max_examples=50, deadline=None, derandomize=True)
settings.register_profile("deep", max_examples=2000, deadline=None)
settings.load_profile(os.environ.get("EVENSTAGE_TESTS", "quick"))
