"""Hypothesis without a deadline per case: the first call of a solver loads its library."""

from __future__ import annotations

from hypothesis import settings

settings.register_profile("no-deadline", deadline=None)
settings.load_profile("no-deadline")
