"""Settings that all tests share."""

from __future__ import annotations

import os

from hypothesis import Phase, settings

# ``EVENSTAGE_TESTS=deep pytest`` looks longer and at new examples each time. Otherwise a run is
# quick and the same for everybody; shrinking a failure, many minutes where each example
# is a whole resizing, is left to ``deep``.
settings.register_profile(
    "quick",
    max_examples=50,
    deadline=None,
    derandomize=True,
    phases=[Phase.explicit, Phase.generate],
)
settings.register_profile("deep", max_examples=2000, deadline=None)
settings.load_profile(os.environ.get("EVENSTAGE_TESTS", "quick"))
