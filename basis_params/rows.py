"""Rows of the side tables: value cells plus source key, locator and provenance."""

from __future__ import annotations

import csv
from importlib import resources


def side_table(name: str) -> tuple[dict[str, str], ...]:
    """Return the rows of ``tables/<name>.csv``; leading ``#`` lines are remarks.

    Raises
    ------
    FileNotFoundError
        If the package ships no such table.
    """
    text = resources.files("basis_params").joinpath("tables", f"{name}.csv").read_text("utf-8")
    lines = [line for line in text.splitlines() if not line.startswith("#")]
    return tuple(csv.DictReader(lines, strict=True))


def optional_number(text: str) -> float | None:
    """Return the number of a cell, None for a blank one (no value is known)."""
    return float(text) if text else None
