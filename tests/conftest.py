"""What holds for all tests."""

from __future__ import annotations

import os

from hypothesis import settings

# a busy machine is no finding: how long one example takes depends on what else runs
settings.register_profile("agewatch", deadline=None, derandomize=True)
# HYPOTHESIS_PROFILE=explore looks for new examples at every run
settings.register_profile("explore", deadline=None)
settings.load_profile(os.environ.get("HYPOTHESIS_PROFILE", "agewatch"))
