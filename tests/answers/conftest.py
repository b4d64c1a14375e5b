"""A small plan, and the helpers of other folders: stand-in of the online service, independent places."""

import re
import sys
from pathlib import Path
from types import SimpleNamespace

import pytest

from coldglow.answers import plan
from coldglow.describe.load import load_request

sys.path[:0] = [str(Path(__file__).parents[1] / folder) for folder in ("bridges", "sky")]
ROOT = Path(__file__).parents[2]


def small_request(folder):
    """The shipped season of Uranus, cut to five nights, six bins and two years, so that tests stay quick."""
    text = (ROOT / "examples" / "uranus-season.yaml").read_text(encoding="utf-8")
    text = text.replace("first: 2027-09-01", "first: 2027-12-18").replace(
        "last: 2028-03-02", "last: 2027-12-22"
    )
    text = re.sub(r"  forbidden:.*?(?=\n  step:)", "", text, flags=re.DOTALL)
    text = re.sub(r"bins: 12", "bins: 6", text)
    text = re.sub(r"(coverage:.*?\n  snr:) \d+", r"\1 12", text, flags=re.DOTALL)
    text = re.sub(r"last_year: \d+", "last_year: 2028", text)
    text = re.sub(r"(correlation: 0.3.*\n  probability:) 90 %", r"\1 50 %", text)
    path = folder / "small.yaml"
    path.write_text(text, encoding="utf-8")
    return path


@pytest.fixture(scope="session")
def small(tmp_path_factory):
    """A request for five nights, all that was found for it, and the folder that was planned from it."""
    folder = tmp_path_factory.mktemp("small")
    path = small_request(folder)
    steps, kept = [], []
    module = sys.modules["coldglow.answers.plan"]
    find_out = module.find_out

    def keep(*args):
        kept.append(find_out(*args))
        return kept[-1]

    with pytest.MonkeyPatch.context() as patch:
        patch.setattr(module, "find_out", keep)
        result = plan(path, folder / "plan", tell=steps.append)
    return SimpleNamespace(
        path=path,
        folder=folder / "plan",
        request=load_request(path),
        result=result,
        steps=steps,
        found=kept[0],
    )
