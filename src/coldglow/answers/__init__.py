"""One function per command: what the user asked in, a `Result` out."""

from coldglow.answers.glow import glow
from coldglow.answers.sky import sky

__all__ = ["glow", "sky"]
