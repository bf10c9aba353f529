"""Conditions on columns."""

from __future__ import annotations

from dataclasses import dataclass


@dataclass(frozen=True, slots=True)
class Condition:
    """A condition on the columns of the store, with its values bound."""

    text: str
