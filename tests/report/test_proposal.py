from __future__ import annotations

import re
import shutil
import subprocess

import numpy as np
import pytest
from hypothesis import given
from hypothesis import strategies as st

from coldglow.report import tex
from coldglow.report.proposal import (
    Justification,
    bibliography,
    justification_markdown,
    justification_tex,
    rounded,
)
from coldglow.report.references import METHODS
from coldglow.report.results import Entry, column, table

NASTY = r"Cold {glow} & 50 % of #1_2 $x$ \x ~ ^ <b> | `é ß` 漢字 ħ ₃ H₃⁺ 10⁻¹⁵ λ ± − … “q” [link](x) *"


def invented(title: str = "Glow of a cold planet") -> Justification:
    nights = table(
        column("night", ["2027-11-05", "2027-11-06"]),
        column("longitude_start", [12.34, 359.96], "deg", decimals=1),
        column("radiance", [1.2e-8, -3e-9], "W m-2 sr-1"),
        column("time_to_goal", [1.0, np.inf], "h", infinite="never"),
        column("seed", [1, 2], shown=False),
        caption="Nights asked for",
    )
    numbers = [
        ("Temperature", Entry(480.0, "K", random_error=12.0, systematic_error=9.0)),
        ("Setting", Entry("l_band")),
    ]
    paragraphs = [
        "The target is seen at airmass 1.2 [@young1994; @archinal2018].",
        "It was found by its light at 3.5 µm [@drossart1989]; 50 % remain.",
    ]
    return Justification(title, paragraphs, numbers, nights)


def test_numbers_are_rounded_by_their_larger_error():
    assert rounded(Entry(483.21, "K", random_error=2.2, systematic_error=14.1)) == (
        "483 ± 2 (random) ± 14 (systematic) K"
    )
    assert rounded(Entry(483.21, "K", random_error=2.26)) == "483.2 ± 2.3 K (random)"
    assert rounded(Entry(483.21, "K", systematic_error=9.0)) == "483 ± 9 K (systematic)"
    assert rounded(Entry(3)) == "3"
    assert rounded(Entry("l_band")) == "l_band"
    assert rounded(Entry(1.0, text="as measured", random_error=0.5)) == "as measured"
    assert rounded(Entry(np.inf, "h", random_error=np.inf)) == "∞ h, not constrained (random)"


def test_tex_specials_are_escaped():
    assert tex.escape("a_b & 5 % #1 {x} $") == r"a\_b \& 5 \% \#1 \{x\} \$"
    assert tex.escape("10⁻¹⁵ m²") == "10$^{-15}$ m$^{2}$"
    assert tex.escape("é 漢") == "é ?"
    assert tex.escape("a\nb") == "a b"
    assert tex.number("1.5e-9") == r"$1.5\times10^{-9}$"
    assert tex.number("inf") == r"$\infty$"
    assert tex.number("nan") == "--"


@given(st.text(max_size=40))
def test_escaped_text_holds_no_active_character(text):
    escaped = tex.escape(text)
    bare = re.sub(r"\\[{}$&#%_,]", "", escaped)
    bare = re.sub(r"\\(text[a-z]+|ldots)\{\}", "", bare)
    bare = re.sub(r"\$[^$]*\$", "", bare)
    assert not set(bare) & set("\\{}$&#%_^")
    assert "\n" not in escaped


def test_markdown_has_the_same_text_with_references_written_out():
    text = justification_markdown(invented("Glow of *a* planet_x"))
    assert text.startswith("# Glow of \\*a\\* planet\\_x\n")
    assert "(Young 1994; Archinal et al. 2018)" in text
    assert "* Drossart et al. 1989, Nature 340, 539" in text
    assert "Tegmark" not in text
    assert "| Temperature | 480 ± 12 (random) ± 9 (systematic) K |" in text
    assert "| 2027-11-06 | 360.0 | −3.000×10⁻⁹ | never |" in text
    assert "seed" not in text.lower()


def test_an_unknown_citation_is_refused():
    text = Justification("x", ["as shown [@nobody2000]"])
    with pytest.raises(KeyError, match="nobody2000"):
        text.cited()


def test_references_have_distinct_keys_and_a_place():
    assert len({reference.key for reference in METHODS}) == len(METHODS)
    entries = bibliography(METHODS)
    assert entries.count("@article{") == len(METHODS)
    assert "author = {Archinal, B. A. and Acton, C. H. and others}" in entries
    for reference in METHODS:
        assert reference.full in {
            "Archinal et al. 2018, Celestial Mechanics and Dynamical Astronomy 130, 22",
            "Drossart et al. 1989, Nature 340, 539",
            "Young 1994, Applied Optics 33, 1108",
            "Tegmark et al. 1997, The Astrophysical Journal 480, 22",
            "Garnett & Forrest 1993, Proceedings of SPIE 1946, 395",
            "Gabriel & Neumann 1962, Quarterly Journal of the Royal Meteorological Society 88, 90",
        }


@pytest.mark.skipif(
    shutil.which("pdflatex") is None or shutil.which("bibtex") is None,
    reason="no TeX installation is present",
)
@pytest.mark.parametrize("title", ["Glow of a cold planet", NASTY])
@pytest.mark.parametrize("alone", [True, False])
def test_tex_compiles_alone_and_by_input(tmp_path, title, alone):
    (tmp_path / "justification.tex").write_text(justification_tex(invented(title)), encoding="utf-8")
    (tmp_path / "references.bib").write_text(bibliography(METHODS), encoding="utf-8")
    outer = (
        "\\documentclass{article}\\usepackage[utf8]{inputenc}\\usepackage[T1]{fontenc}\\begin{document}\n"
        "Before.\\input{justification}After.\\bibliographystyle{plain}\\bibliography{references}\\end{document}\n"
    )
    (tmp_path / "outer.tex").write_text(outer, encoding="utf-8")
    name = "justification" if alone else "outer"
    latex = ["pdflatex", "-interaction=nonstopmode", "-halt-on-error", "-no-shell-escape", name]
    for command in (latex, ["bibtex", name], latex, latex):
        run = subprocess.run(
            command, cwd=tmp_path, capture_output=True, text=True, errors="replace", check=False
        )
        assert run.returncode == 0, run.stdout[-2000:]
    assert "undefined" not in run.stdout
    assert (tmp_path / f"{name}.pdf").stat().st_size > 5000
