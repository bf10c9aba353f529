"""Charge and unpaired electrons from the key=value pairs of a comment line or an info dictionary."""

from __future__ import annotations

import re
from collections.abc import Iterable, Set
from dataclasses import dataclass

from ehmo.errors import InputError
from ehmo.structure.files import shown

_PAIR = re.compile(r"""(?<![^\s,;])([A-Za-z0-9_]{1,40})\s*=\s*("[^"]*"|'[^']*'|[^\s,;]+)""")
_WHOLE = re.compile(r"[+-]?\d{1,4}(\.0{1,8})?")
_SIGN_LAST = re.compile(r"(\d{1,4})([+-])")
_CHARGE_KEYS = frozenset({"charge", "total_charge"})
_UNPAIRED_KEYS = frozenset({"unpaired", "unpaired_electrons", "spin2s", "2s"})
_MULTIPLICITY_KEYS = frozenset({"multiplicity", "mult"})
ELECTRON_KEYS = _CHARGE_KEYS | _UNPAIRED_KEYS | _MULTIPLICITY_KEYS
"""Keys, in lower case, that state charge or spin."""


@dataclass(frozen=True, slots=True)
class StatedElectrons:
    """Charge and unpaired electrons as a file states them; None where it does not."""

    charge: int | None = None
    unpaired_electrons: int | None = None


def comment_pairs(comment: str) -> list[tuple[str, str]]:
    """Pairs ``key=value`` of a comment line, quotes taken off."""
    return [(key, value.strip("\"'")) for key, value in _PAIR.findall(comment)]


def without_keys(comment: str, keys: Set[str]) -> str:
    """Comment line with the pairs of some keys (in lower case) taken out."""
    return _PAIR.sub(lambda pair: "" if pair[1].lower() in keys else pair[0], comment).strip()


def stated_electrons(pairs: Iterable[tuple[str, object]], place: str) -> StatedElectrons:
    """Charge and unpaired electrons from key-value pairs.

    Keys, in any case: ``charge`` or ``total_charge``; ``unpaired``, ``unpaired_electrons``, ``spin2S`` or ``2S``
    for the number of unpaired electrons; ``multiplicity`` or ``mult`` for 2S+1.

    Raises
    ------
    InputError
        If a value is no whole number, two keys disagree, or a bare ``spin`` leaves open what is counted.
    """
    charges: dict[str, int] = {}
    unpaired: dict[str, int] = {}
    for key, value in pairs:
        name = key.lower()
        if name in _CHARGE_KEYS:
            charges[key] = _whole(key, value, place)
        elif name in _UNPAIRED_KEYS:
            unpaired[key] = _whole(key, value, place)
        elif name in _MULTIPLICITY_KEYS:
            unpaired[key] = _whole(key, value, place) - 1
        elif name == "spin":
            raise InputError(
                f"spin={shown(value, 20)} may be S, 2S or 2S+1",
                place=place,
                mend="write unpaired=2S or multiplicity=2S+1",
            )
    count = _agreed(unpaired, "unpaired electrons", place)
    if count is not None and count < 0:
        raise InputError(f"{count} unpaired electrons", place=place, mend="unpaired starts at 0, multiplicity at 1")
    return StatedElectrons(_agreed(charges, "charge", place), count)


def _whole(key: str, value: object, place: str) -> int:
    text = str(value).strip()
    flipped = _SIGN_LAST.fullmatch(text)
    text = flipped[2] + flipped[1] if flipped else text
    if not _WHOLE.fullmatch(text):
        raise InputError(f"{key}={shown(value, 20)} is no whole number", place=place, mend=f"write for example {key}=2")
    return int(float(text))


def _agreed(found: dict[str, int], what: str, place: str) -> int | None:
    if len(set(found.values())) > 1:
        keys = ", ".join(found)
        raise InputError(f"the keys {keys} disagree on the {what}", place=place, mend="keep one of them")
    return next(iter(found.values()), None)
