"""What ships works from a wheel, from a wheel made of the source archive, and from an editable install."""

import os
import subprocess
import sys
import zipfile
from pathlib import Path

import pytest

ROOT = Path(__file__).parent.parent
ASK = (
    "import coldglow, pathlib; from coldglow.describe.load import load_instrument, load_target, names;"
    "print(pathlib.Path(coldglow.__file__).parent); print(*names('target')); print(*names('instrument'));"
    "print(load_target('uranus').name, load_instrument('echelle-4m').name);"
    "from coldglow.answers import glow; print(len(glow('neptune')['radiance']))"
)
TARGETS = "cold-giant jupiter neptune saturn uranus"
INSTRUMENTS = "cold-space-ifu echelle-4m echelle-8m grating-8m ifu-8m longslit-4m narrowband-3m"


def build(source, out, kind):
    words = [sys.executable, "-m", "build", f"--{kind}", "--no-isolation", "--outdir", str(out), str(source)]
    subprocess.run(words, check=True, capture_output=True, cwd=out)
    (found,) = out.glob("*.whl" if kind == "wheel" else "*.tar.gz")
    return found


def ask(folder, tmp_path):
    environment = {**os.environ, "PYTHONPATH": str(folder)} if folder else dict(os.environ)
    found = subprocess.run(
        [sys.executable, "-c", ASK], env=environment, cwd=tmp_path, check=True, capture_output=True, text=True
    )
    return found.stdout.splitlines()


@pytest.fixture(scope="module")
def wheels(tmp_path_factory):
    """A wheel from the checkout, and one from its source archive."""
    direct = build(ROOT, tmp_path_factory.mktemp("wheel"), "wheel")
    archive = build(ROOT, tmp_path_factory.mktemp("sdist"), "sdist")
    unpacked = tmp_path_factory.mktemp("unpacked")
    subprocess.run(["tar", "-xf", str(archive), "-C", str(unpacked)], check=True)
    (source,) = unpacked.iterdir()
    return {"wheel": direct, "sdist to wheel": build(source, tmp_path_factory.mktemp("second"), "wheel")}


@pytest.mark.parametrize("kind", ["wheel", "sdist to wheel"])
def test_targets_and_instruments_are_found_in_a_wheel(wheels, kind, tmp_path):
    place = tmp_path / "site"
    with zipfile.ZipFile(wheels[kind]) as wheel:
        wheel.extractall(place)
    home, targets, instruments, loaded, lines = ask(place, tmp_path)
    assert Path(home) == place / "coldglow"
    assert (targets, instruments, loaded) == (TARGETS, INSTRUMENTS, "Uranus echelle-4m")
    assert int(lines) == 10143


def test_targets_and_instruments_are_found_in_the_checkout(tmp_path):
    home, targets, instruments, loaded, _ = ask(ROOT / "src", tmp_path)
    assert Path(home) == ROOT / "src" / "coldglow"
    assert (targets, instruments, loaded) == (TARGETS, INSTRUMENTS, "Uranus echelle-4m")


def test_licence_and_notices_travel_with_the_wheel(wheels):
    with zipfile.ZipFile(wheels["wheel"]) as wheel:
        names = wheel.namelist()
        notice = next(
            name for name in names if name.endswith("dist-info/licenses/src/coldglow/data/NOTICE.md")
        )
        assert b"Redistribution and use in source and binary forms" in wheel.read(notice)
        (metadata,) = (name for name in names if name.endswith("METADATA"))
        assert b"License-Expression: BSD-3-Clause" in wheel.read(metadata)
    assert "coldglow/data/NOTICE.md" in names
    assert "coldglow/LICENSE" in names
