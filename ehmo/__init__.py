"""Bonding calculator for metal-oxo compounds.

``ehmo.read`` takes a file to a fragment, ``ehmo.bond_report`` takes a fragment to a bond report, ``ehmo.open_store``
opens the results of many; all are loaded on first use, so that ``import ehmo`` costs nothing.
"""

from __future__ import annotations

from importlib import import_module
from typing import TYPE_CHECKING, Any

if TYPE_CHECKING:
    from ehmo.calculate import bond_report
    from ehmo.errors import EhmoError
    from ehmo.records.fragment import Fragment
    from ehmo.records.options import Options
    from ehmo.records.report import BondReport
    from ehmo.store import open_store
    from ehmo.structure import from_ase, read, read_frames
    from ehmo.studies.ase_calculator import Calculator
    from ehmo.studies.spread import spread_report

__version__ = "0.1.0"

_HOMES = {
    "BondReport": "ehmo.records.report",
    "Calculator": "ehmo.studies.ase_calculator",
    "EhmoError": "ehmo.errors",
    "Fragment": "ehmo.records.fragment",
    "Options": "ehmo.records.options",
    "bond_report": "ehmo.calculate",
    "from_ase": "ehmo.structure",
    "open_store": "ehmo.store",
    "read": "ehmo.structure",
    "read_frames": "ehmo.structure",
    "spread_report": "ehmo.studies.spread",
}

__all__ = [
    "BondReport",
    "Calculator",
    "EhmoError",
    "Fragment",
    "Options",
    "__version__",
    "bond_report",
    "figures",
    "from_ase",
    "open_store",
    "read",
    "read_frames",
    "spread_report",
]


def __dir__() -> list[str]:
    return sorted({*globals(), *__all__})


def __getattr__(name: str) -> Any:
    if name == "figures":
        return import_module("ehmo.figures")
    if name in _HOMES:
        return getattr(import_module(_HOMES[name]), name)
    raise AttributeError(f"module 'ehmo' has no attribute {name!r}")
