# Types of what __init__.py imports when it is first used.

from coldglow import answers as answers
from coldglow.answers import check as check
from coldglow.answers import compare as compare
from coldglow.answers import cover as cover
from coldglow.answers import draft as draft
from coldglow.answers import expose as expose
from coldglow.answers import fade as fade
from coldglow.answers import fetch as fetch
from coldglow.answers import glow as glow
from coldglow.answers import hours as hours
from coldglow.answers import nights as nights
from coldglow.answers import show as show
from coldglow.describe.load import load_instrument as load_instrument
from coldglow.describe.load import load_request as load_request
from coldglow.describe.load import load_target as load_target
from coldglow.report.reading import read_result as read_result

__version__: str
