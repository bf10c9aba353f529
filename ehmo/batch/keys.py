"""Keys of structures: the same key means the same numbers."""

from __future__ import annotations

import hashlib
import json
from collections.abc import Mapping
from typing import Any

import numpy as np

from ehmo.batch.items import BatchSettings, WorkItem
from ehmo.errors import EhmoError
from ehmo.records.arrays import FloatArray
from ehmo.records.crystal import CrystalContents
from ehmo.records.fragment import Fragment
from ehmo.records.options import Options
from ehmo.structure import assign_electrons, perceive

RESULTS_EDITION = 1
"""Raise it with every change that changes numbers: rows of earlier editions then do not count as done."""

_STEP_A = 1e-6
"""Positions that agree to this are the same [angstrom]."""

_NUMBERLESS = frozenset({"charge", "unpaired_electrons", "max_functions"})
"""Options that have their own place in the key, or that decide only whether there is a result."""


def molecule_key(fragment: Fragment, settings: BatchSettings, options: Options) -> str:
    """Key of a molecule.

    Parameters
    ----------
    fragment : Fragment
    settings : BatchSettings
        With the hash of the parameter set.
    options : Options
        With charge and spin of the item.

    Returns
    -------
    key : str
        SHA-256 in hexadecimal of the canonical JSON of elements, positions, copies and symmetry in the crystal, charge
        and spin as they will be used, and all that `settings` says on numbers.
    """
    charge, unpaired = _electrons(fragment, options)
    origin = fragment.crystal
    return _hashed(
        {
            "molecule": list(fragment.symbols),
            "positions_1e-6_A": _steps(fragment.positions_A),
            "crystal": None if origin is None else [origin.multiplicity, np.asarray(origin.permutations).tolist()],
            "charge": charge,
            "unpaired": unpaired,
            **_calculation(settings, options),
            "draws": settings.draws,
        }
    )


def crystal_key(contents: CrystalContents, settings: BatchSettings, options: Options) -> str:
    """Key of an extended structure; arguments as for `molecule_key`."""
    return _hashed(
        {
            "crystal": list(contents.symbols),
            "positions_1e-6_A": _steps(contents.positions_A),
            "cell_1e-6_A": _steps(contents.cell_A),
            "sites": np.asarray(contents.sites).tolist(),
            # No mesh given means that of the cell, by a rule that belongs to the edition.
            "mesh": settings.mesh,
            "cations": settings.cations,
            "charge": options.charge,
            "unpaired": options.unpaired_electrons,
            **_calculation(settings, options),
        }
    )


def unread_key(item: WorkItem, settings: BatchSettings) -> str:
    """Key of a piece of a file of which no structure could be made: by its text, or by its name where it has none."""
    return _hashed(
        {
            "unread": item.kind,
            "source": item.place if item.kind not in ("xyz", "cif") else None,
            "text": hashlib.sha256(item.text.encode("latin-1", "replace")).hexdigest(),
            "charge": item.charge,
            "unpaired": item.unpaired_electrons,
            "hydrogens": settings.hydrogens,
            **_calculation(settings, settings.options),
        }
    )


def _electrons(fragment: Fragment, options: Options) -> tuple[int | None, int | list[int] | None]:
    """Charge and unpaired electrons as used: a list where the ladder will choose, None where counting refuses."""
    charge = fragment.charge if options.charge is None else options.charge
    unpaired = fragment.unpaired_electrons if options.unpaired_electrons is None else options.unpaired_electrons
    if charge is not None and unpaired is not None:
        return charge, unpaired
    try:
        assigned = assign_electrons(
            fragment, perceive(fragment), options.charge, options.unpaired_electrons, options.oxidation_state
        )
    except EhmoError:
        return charge, unpaired
    return assigned.charge, list(assigned.spin_candidates) or assigned.unpaired_electrons


def _calculation(settings: BatchSettings, options: Options) -> dict[str, Any]:
    """What of the settings can change a number."""
    from dataclasses import asdict

    return {
        "parameters": settings.parameter_sha256,
        "options": {name: value for name, value in asdict(options).items() if name not in _NUMBERLESS},
        "edition": RESULTS_EDITION,
    }


def _steps(values_A: FloatArray) -> list[list[int]]:
    steps: list[list[int]] = np.rint(values_A / _STEP_A).astype(np.int64).tolist()
    return steps


def _hashed(content: Mapping[str, Any]) -> str:
    text = json.dumps(content, sort_keys=True, separators=(",", ":"), ensure_ascii=True, allow_nan=True)
    return hashlib.sha256(text.encode("ascii")).hexdigest()
