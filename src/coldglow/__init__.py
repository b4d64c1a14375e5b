"""Coldglow: can the H3+ glow of a giant planet be detected, when, for how long, in how many nights?"""

from __future__ import annotations

__version__ = "0.1.0"
