"""What holds for all tests."""

from __future__ import annotations

from hypothesis import settings

# a busy machine is no finding: how long one example takes depends on what else runs
settings.register_profile("agewatch", deadline=None)
settings.load_profile("agewatch")
