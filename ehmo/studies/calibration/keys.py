"""Values of a TOML table, checked as they are taken."""

from __future__ import annotations

import math
from collections.abc import Iterator, Mapping
from typing import Any

from ehmo.errors import InputError


class Keys:
    """Values of one TOML table, checked as they are taken; faults name the key."""

    def __init__(self, place: str, content: Mapping[str, Any], where: str = "") -> None:
        self._place, self._content, self.where = place, content, where

    def fault(self, key: str, fault: str, mend: str) -> InputError:
        """Error that names the key."""
        return InputError(f"{self.where}{key}: {fault}", place=self._place, mend=mend)

    def only(self, known: tuple[str, ...]) -> None:
        """Refuse keys that mean nothing."""
        for key in self._content:
            if key not in known:
                raise self.fault(key, "unknown key", f"known keys are {', '.join(known)}")

    def has(self, key: str) -> bool:
        """Whether the key is given."""
        return key in self._content

    def text(self, key: str, default: str | None = None) -> str:
        """One line of text."""
        value = self._content.get(key, default)
        if not isinstance(value, str) or not value.strip() or not value.isprintable():
            raise self.fault(key, "missing, or no line of text", f'write {key} = "..."')
        return value

    def texts(self, key: str, default: tuple[str, ...] | None = None) -> tuple[str, ...]:
        """List of texts; one text counts as a list of one."""
        value = self._content.get(key, default)
        listed = [value] if isinstance(value, str) else list(value) if isinstance(value, list | tuple) else None
        if listed is None or (not listed and default is None) or not all(_is_line(text) for text in listed):
            raise self.fault(key, "missing, or no list of texts", f'write {key} = ["...", "..."]')
        return tuple(listed)

    def number(
        self, key: str, default: float | None = None, *, lowest: float = -math.inf, above: float = -math.inf
    ) -> float:
        """Finite number within bounds."""
        value = self._content.get(key, default)
        if isinstance(value, bool) or not isinstance(value, int | float) or not math.isfinite(value):
            raise self.fault(key, "missing, or no finite number", f"write {key} = 1.0 or the like")
        if value < lowest or value <= above:
            limit = f"at least {lowest:g}" if value < lowest else f"above {above:g}"
            raise self.fault(key, f"{value:g} is out of range", f"it must be {limit}")
        return float(value)

    def flag(self, key: str) -> bool:
        """Whether a choice is on."""
        value = self._content.get(key, False)
        if not isinstance(value, bool):
            raise self.fault(key, "neither true nor false", f"write {key} = true")
        return value

    def table(self, key: str) -> Keys:
        """Table within."""
        value = self._content.get(key, {})
        if not isinstance(value, dict):
            raise self.fault(key, "no table", f"write [{key}] and keys below it")
        return Keys(self._place, value, f"{key}.")

    def items(self) -> Iterator[tuple[str, Any]]:
        """Keys and raw values."""
        return iter(self._content.items())

    def entries(self, key: str, known: tuple[str, ...]) -> Iterator[Keys]:
        """Entries of an array of tables, counted from 1 in messages."""
        value = self._content.get(key, [])
        if not isinstance(value, list) or not all(isinstance(entry, dict) for entry in value):
            raise self.fault(key, "no list of tables", f"write [[{key}]] and keys below it")
        for count, entry in enumerate(value, start=1):
            keys = Keys(self._place, entry, f"{key} {count}, ")
            keys.only(known)
            yield keys


def _is_line(text: object) -> bool:
    return isinstance(text, str) and bool(text.strip()) and text.isprintable()
