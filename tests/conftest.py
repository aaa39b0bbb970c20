"""Settings for all tests."""

from __future__ import annotations

from hypothesis import settings

# Examples are about right and wrong; a machine that shares its cores may be slow.
settings.register_profile("placer", deadline=None)
settings.load_profile("placer")
