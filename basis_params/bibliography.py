"""The publications behind the source keys."""

from __future__ import annotations

import json
from collections.abc import Mapping
from dataclasses import dataclass
from functools import cache
from importlib import resources

from basis_params.model import FrozenMapping


@dataclass(frozen=True, slots=True)
class Reference:
    """One entry of references.json.

    Attributes
    ----------
    authors, journal, volume, page : str
        Blank where there is none.
    year : int or None
        None for a work that is kept up to date.
    note : str
        How the entry and its values are known.
    title : str
        Blank if not recalled.
    """

    authors: str
    year: int | None
    journal: str
    volume: str
    page: str
    note: str
    title: str = ""

    @property
    def text(self) -> str:
        """One line such as ``R. Hoffmann, J. Chem. Phys. 39, 1397 (1963)``."""
        place = ", ".join(part for part in (f"{self.journal} {self.volume}".strip(), self.page) if part)
        year = f" ({self.year})" if self.year else ""
        return f"{self.authors}, {place}{year}"


@cache
def references() -> Mapping[str, Reference]:
    """Return the bibliography by source key."""
    text = resources.files("basis_params").joinpath("references.json").read_text("utf-8")
    return FrozenMapping({key: Reference(**entry) for key, entry in json.loads(text).items()})
