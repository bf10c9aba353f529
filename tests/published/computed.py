"""What ehmo computes for each row of values.csv, quantity by quantity."""

from __future__ import annotations

import csv
from dataclasses import dataclass
from functools import cache
from itertools import combinations
from pathlib import Path

import numpy as np

from basis_params.bond_valence import bond_valence_R0
from ehmo import Fragment, Options, bond_report
from ehmo.records.bands import Band
from ehmo.records.report import BondReport
from tests.published.structures import SPHERES, STRUCTURES

HERE = Path(__file__).parent

OXIDATION_STATES = {"MnO4 3-": 5}
"""Where counting leaves it open: the long bonds of hypomanganate could be those of hydroxo ligands."""

ALLOWED_STRENGTH = 1e-3
"""Oscillator strength from which a charge-transfer band counts as the lowest allowed one."""


@dataclass(frozen=True)
class Row:
    """One published value; see the head of values.csv for the columns."""

    quantity: str
    system: str
    of: str
    value: str
    uncertainty: str
    unit: str
    tolerance: str
    misses: dict[str, str]
    source_key: str
    locator: str
    read_or_memory: str

    @property
    def name(self) -> str:
        """Test id: what is compared, and the paper."""
        return " ".join(part for part in (self.quantity, self.of, "of", self.system, self.source_key) if part)

    @property
    def is_text(self) -> bool:
        """Whether the value is a label or an order of levels."""
        return self.unit == "text"

    @property
    def allowed(self) -> float:
        """Largest difference that counts as agreement: the stated tolerance and the value's own uncertainty."""
        return float(self.tolerance) + float(self.uncertainty or 0)


def read_table(name: str) -> list[dict[str, str]]:
    """Rows of a table beside this module; lines that start with # say what it is."""
    lines = (HERE / name).read_text("utf-8").splitlines()
    return list(csv.DictReader(line for line in lines if not line.startswith("#")))


def read_values() -> tuple[Row, ...]:
    """All rows of values.csv."""
    rows = []
    for entry in read_table("values.csv"):
        misses = {name.removeprefix("miss_"): value for name, value in entry.items() if name.startswith("miss_")}
        kept = {name: value for name, value in entry.items() if not name.startswith("miss_")}
        rows.append(Row(**kept, misses=misses))
    return tuple(rows)


@cache
def report_on(system: str, parameter_set: str, charge_model: str = "self-consistent") -> BondReport:
    """Report on one structure with the published charge and spin."""
    options = Options(charge_model=charge_model, oxidation_state=OXIDATION_STATES.get(system))
    return bond_report(STRUCTURES[system].fragment(), parameter_set, options)


def computed(row: Row, parameter_set: str) -> float | str:
    """The number or label that stands against a row."""
    return _QUANTITIES[row.quantity](row, parameter_set)


def difference(row: Row, parameter_set: str) -> float:
    """Computed minus published."""
    return float(computed(row, parameter_set)) - float(row.value)


def _length(row: Row, parameter_set: str) -> float:
    kind, _, place = row.of.partition(" ")
    if place not in {"cis", "trans"}:
        kind, place = row.of, ""
    lengths = sorted(b.length_A for b, _ in report_on(row.system, parameter_set).bonds() if b.kind.value == kind)
    # In these ions the trans ligand is the farthest of its kind.
    chosen = {"": lengths, "cis": lengths[:-1], "trans": lengths[-1:]}[place]
    return float(np.mean(chosen))


def _angle(row: Row, parameter_set: str) -> float:
    report = report_on(row.system, parameter_set)
    first, second = row.of.split("-")
    found = []
    for a, b in combinations(report.coordination.bonds, 2):
        if sorted((a.kind.value, b.kind.value)) == sorted((first, second)):
            u, v = (report.fragment.positions_A[x.donor] - report.fragment.positions_A[x.metal] for x in (a, b))
            found.append(np.degrees(np.arccos(u @ v / np.linalg.norm(u) / np.linalg.norm(v))))
    return float(np.mean(found))


def _bond_valence_sum(row: Row, parameter_set: str) -> float:
    if row.system in SPHERES:
        sphere = SPHERES[row.system]
        rows = [(bond_valence_R0(sphere.metal, donor, sphere.oxidation_state), r) for donor, r in sphere.donors]
        return sum(entry.valence(length) for entry, length in rows)
    (site,) = report_on(row.system, parameter_set).sites
    return site.bond_valence_sum


def _unpaired_electrons(row: Row, parameter_set: str) -> float:
    species = STRUCTURES[row.system]
    fragment = Fragment(species.symbols, species.positions_A, charge=species.charge)
    options = Options(oxidation_state=OXIDATION_STATES.get(row.system))
    return bond_report(fragment, parameter_set, options).fragment.unpaired_electrons


def _ten_dq(row: Row, parameter_set: str) -> float:
    (site,) = report_on(row.system, parameter_set).sites
    return site.parameters.crystal_field_per_cm["10Dq"]


def _bands(row: Row, parameter_set: str, *, transfer: bool) -> list[Band]:
    bands = report_on(row.system, parameter_set).spectroscopy.bands
    return [band for band in bands if (band.kind == "charge transfer") is transfer]


def _band_within_the_shell(row: Row, parameter_set: str) -> float:
    term, _, place = row.of.partition(" ")
    same = [band for band in _bands(row, parameter_set, transfer=False) if band.upper_term == term]
    return same[int(place or 1) - 1].wavenumber_per_cm


def _charge_transfer(row: Row, parameter_set: str) -> float:
    needed = ALLOWED_STRENGTH if row.of == "lowest allowed" else 0.0
    bands = _bands(row, parameter_set, transfer=True)
    return min(band.wavenumber_per_cm for band in bands if band.oscillator_strength >= needed)


def _g(row: Row, parameter_set: str) -> float:
    report = report_on(row.system, parameter_set)
    axis = {"parallel": 2, "perpendicular": 0}[row.of]
    return report.spectroscopy.magnetism.g_tensor.along(np.eye(3)[axis])


def _frontier(row: Row, parameter_set: str) -> str:
    report = report_on(row.system, parameter_set)
    place = report.state.homo if row.quantity == "highest filled" else report.state.homo + 1
    return report.irreps.labels[place]


def _ladder_order(row: Row, parameter_set: str) -> str:
    report = report_on(row.system, parameter_set)
    (site,) = report.sites
    labels = [report.irreps.labels[level.orbital] for level in site.ladder.levels]
    return " ".join(dict.fromkeys(labels))


def _first_transition(row: Row, parameter_set: str) -> str:
    return next(band.transition for band in _bands(row, parameter_set, transfer=False) if band.spin_allowed)


def _lowest_excited_term(row: Row, parameter_set: str) -> str:
    return _bands(row, parameter_set, transfer=False)[0].upper_term


def _formal_order(row: Row, parameter_set: str) -> float:
    report = report_on(row.system, parameter_set)
    orders = [
        float(formal.order)
        for bond, formal in zip(report.coordination.bonds, report.formal_orders, strict=True)
        if bond.kind.value == row.of
    ]
    return float(np.mean(orders))


def _filled_gap(row: Row, parameter_set: str) -> float:
    state = report_on(row.system, parameter_set).state
    filled = state.energies_eV[state.occupations.sum(axis=0) > 0]
    return float(filled[-1] - filled[-2])


_QUANTITIES = {
    "length": _length,
    "angle": _angle,
    "bond_valence_sum": _bond_valence_sum,
    "unpaired_electrons": _unpaired_electrons,
    "10Dq": _ten_dq,
    "d-d band": _band_within_the_shell,
    "charge-transfer band": _charge_transfer,
    "g": _g,
    "highest filled": _frontier,
    "lowest empty": _frontier,
    "ladder order": _ladder_order,
    "first d-d transition": _first_transition,
    "lowest excited term": _lowest_excited_term,
    "formal_order": _formal_order,
    "transition of a published calculation": _band_within_the_shell,
    "gap of the two highest filled": _filled_gap,
}
QUANTITIES = tuple(_QUANTITIES)
