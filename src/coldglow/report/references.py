"""The published methods that the forecast rests on, for the bibliography of a proposal.

Volumes and pages are those cited beside the code; the titles are from memory.
"""

from __future__ import annotations

from dataclasses import dataclass


@dataclass(frozen=True, slots=True)
class Reference:
    """One article: a key to cite it by, authors as "Family, Initials" (or "others"), and where it stands."""

    key: str
    authors: tuple[str, ...]
    year: int
    title: str
    journal: str
    volume: str
    page: str
    doi: str = ""

    @property
    def short(self) -> str:
        """Return it as cited in running text: ``Archinal et al. 2018``."""
        names = [author.split(",")[0] for author in self.authors]
        if len(names) > 2:
            return f"{names[0]} et al. {self.year}"
        return f"{' & '.join(names)} {self.year}"

    @property
    def full(self) -> str:
        """Return it as it stands in a list: ``Young 1994, Applied Optics 33, 1108``."""
        return f"{self.short}, {self.journal} {self.volume}, {self.page}"


METHODS = (
    Reference(
        "archinal2018",
        ("Archinal, B. A.", "Acton, C. H.", "others"),
        2018,
        "Report of the IAU Working Group on Cartographic Coordinates and Rotational Elements: 2015",
        "Celestial Mechanics and Dynamical Astronomy",
        "130",
        "22",
        "10.1007/s10569-017-9805-5",
    ),
    Reference(
        "drossart1989",
        ("Drossart, P.", "Maillard, J.-P.", "others"),
        1989,
        "Detection of H3+ on Jupiter",
        "Nature",
        "340",
        "539",
        "10.1038/340539a0",
    ),
    Reference(
        "young1994",
        ("Young, A. T.",),
        1994,
        "Air mass and refraction",
        "Applied Optics",
        "33",
        "1108",
        "10.1364/AO.33.001108",
    ),
    Reference(
        "tegmark1997",
        ("Tegmark, M.", "Taylor, A. N.", "Heavens, A. F."),
        1997,
        "Karhunen-Loeve eigenvalue problems in cosmology: how should we tackle large data sets?",
        "The Astrophysical Journal",
        "480",
        "22",
        "10.1086/303939",
    ),
    Reference(
        "garnett1993",
        ("Garnett, J. D.", "Forrest, W. J."),
        1993,
        "Multiply sampled read-limited and background-limited noise performance",
        "Proceedings of SPIE",
        "1946",
        "395",
    ),
    Reference(
        "gabriel1962",
        ("Gabriel, K. R.", "Neumann, J."),
        1962,
        "A Markov chain model for daily rainfall occurrence at Tel Aviv",
        "Quarterly Journal of the Royal Meteorological Society",
        "88",
        "90",
    ),
)
