"""One function per command: what the user asked in, a `Result` out."""

from coldglow.answers.compare import compare
from coldglow.answers.cover import cover
from coldglow.answers.descriptions import check, draft, show
from coldglow.answers.expose import expose
from coldglow.answers.fade import fade
from coldglow.answers.fetch import fetch
from coldglow.answers.glow import glow
from coldglow.answers.hours import hours
from coldglow.answers.nights import nights
from coldglow.answers.plan import plan
from coldglow.answers.sky import sky

__all__ = [
    "check",
    "compare",
    "cover",
    "draft",
    "expose",
    "fade",
    "fetch",
    "glow",
    "hours",
    "nights",
    "plan",
    "show",
    "sky",
]
