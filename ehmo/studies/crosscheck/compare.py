"""A bond report set beside a minimal-basis run of the same fragment."""

from __future__ import annotations

from collections.abc import Callable, Iterable
from pathlib import Path
from typing import Final

import numpy as np

from ehmo.records.crosscheck import (
    AtomNumbers,
    BondComparison,
    Crosscheck,
    FrontierComparison,
    FrontierLevel,
    LadderComparison,
    LadderStep,
    Theory,
)
from ehmo.records.ligand_field import Ladder
from ehmo.records.report import BondReport
from ehmo.records.symmetry import OrbitalIrreps
from ehmo.studies.crosscheck.readings import Orbitals, RunReading, read_run, report_bonds, report_orbitals
from ehmo.studies.crosscheck.reference import DEFAULT_TIMEOUT_S, reference_run
from ehmo.studies.crosscheck.verdicts import swapped_levels, verdict

FILLED_LEVELS: Final = 4
EMPTY_LEVELS: Final = 4
"""Levels listed on either side of the frontier."""

NEAR_FRONTIER_EV: Final = 0.30
"""Levels this near to the frontier count as being at it [eV]."""

_HOLDS_ELECTRONS = 0.1  # electrons of an orbital or set; even sharing may leave an orbital with a quarter of one


def crosscheck(
    report: BondReport,
    theory: Theory = "pbe",
    *,
    cache: Path | None = None,
    timeout_s: float = DEFAULT_TIMEOUT_S,
    progress: Callable[[str], None] | None = None,
) -> Crosscheck:
    """Set a report beside a minimal-basis run.

    Parameters
    ----------
    report : BondReport
        Its charge and unpaired electrons are those of the run.
    theory : {"pbe", "b3lyp", "hf"}
        Functional, or restricted (open-shell) Hartree-Fock.
    cache : Path, optional
        Folder of earlier runs; none is read or kept if missing.
    timeout_s : float
        The run is stopped after this time [s].
    progress : callable, optional
        Called with one line on each step of the run.

    Returns
    -------
    comparison : Crosscheck

    Raises
    ------
    EhmoError
        See `reference_run`; a run that did not converge is never compared.
    """
    run = reference_run(report.fragment, theory, cache=cache, timeout_s=timeout_s, progress=progress)
    reading = read_run(report, run)
    atoms = tuple(
        (AtomNumbers(float(charge), float(spin)), theirs)
        for charge, spin, theirs in zip(report.populations.charges, report.populations.spin, reading.atoms, strict=True)
    )
    ladders = _ladders(report, reading)
    of_metal = {ladder.metal: ladder for ladder in ladders}
    bonds = tuple(
        BondComparison(
            bond,
            ours,
            theirs,
            verdict(
                ours,
                theirs,
                run,
                atoms[bond.metal],
                report.fragment.unpaired_electrons or 0,
                of_metal[bond.metal],
            ),
        )
        for bond, ours, theirs in zip(report.coordination.bonds, report_bonds(report), reading.bonds, strict=True)
    )
    return Crosscheck(report, run, atoms, bonds, ladders, _frontier(report, reading))


def _ladders(report: BondReport, reading: RunReading) -> tuple[LadderComparison, ...]:
    found = []
    for place, site in enumerate(report.sites):
        theirs = reading.ladders[place] if reading.ladders else None
        ours_steps = () if site.ladder is None else _steps(site.ladder, report.irreps)
        their_steps = () if theirs is None else _steps(theirs, reading.orbitals.irreps)
        withheld = []
        if site.ladder is None:
            withheld.append(f"no ladder of the report: {site.ladder_withheld}")
        if theirs is None:
            withheld.append(f"no ladder of the run: {reading.withheld}")
        elif site.ladder is not None and site.ladder.angular_momentum != theirs.angular_momentum:
            withheld.append(
                f"the ladder of the run is that of {theirs.shell}, the report's that of {site.ladder.shell}"
            )
            their_steps = ()
        shell = next((ladder.shell for ladder in (site.ladder, theirs) if ladder is not None), "")
        swapped = swapped_levels(ours_steps, their_steps, _dimensions(report))
        found.append(LadderComparison(site.metal, shell, ours_steps, their_steps, tuple(withheld), swapped))
    return tuple(found)


def _steps(ladder: Ladder, irreps: OrbitalIrreps | None) -> tuple[LadderStep, ...]:
    lowest = ladder.levels[0].energy_eV
    return tuple(
        LadderStep(
            (irreps.labels[level.orbital] if irreps is not None and level.orbital is not None else "")
            or level.function,
            level.energy_eV - lowest,
            level.electrons,
            level.metal_share,
        )
        for level in ladder.levels
    )


def _dimensions(report: BondReport) -> dict[str, int]:
    if report.irreps is None:
        return {}
    group = report.sites[0].symmetry.group
    return {irrep: int(size) for irrep, size in zip(group.irreps, group.dimensions, strict=True)}


def _frontier(report: BondReport, reading: RunReading) -> FrontierComparison:
    dimensions = _dimensions(report)
    ours, reference = (_levels(orbitals, dimensions) for orbitals in (report_orbitals(report), reading.orbitals))
    judged = bool(dimensions)
    return FrontierComparison(
        ours,
        reference,
        bool(_near(ours, filled=True) & _near(reference, filled=True)) if judged else None,
        bool(_near(ours, filled=False) & _near(reference, filled=False)) if judged else None,
    )


def _levels(orbitals: Orbitals, dimensions: dict[str, int]) -> tuple[FrontierLevel, ...]:
    """Levels round the frontier, lowest first; partners of one set are neighbours with the same irrep."""
    highest = int(np.flatnonzero(orbitals.electrons > _HOLDS_ELECTRONS)[-1])
    sets = list(_sets(orbitals, dimensions))
    (frontier,) = (place for place, members in enumerate(sets) if highest in members)
    zero = float(orbitals.energies_eV[highest])
    return tuple(
        _level(orbitals, members, zero)
        for members in sets[max(frontier + 1 - FILLED_LEVELS, 0) : frontier + 1 + EMPTY_LEVELS]
    )


def _sets(orbitals: Orbitals, dimensions: dict[str, int]) -> Iterable[list[int]]:
    count, start = len(orbitals.energies_eV), 0
    labels = ("",) * count if orbitals.irreps is None else orbitals.irreps.labels
    while start < count:
        stop = start + 1
        while stop < count and stop - start < dimensions.get(labels[start], 1) and labels[stop] == labels[start]:
            stop += 1
        yield list(range(start, stop))
        start = stop


def _level(orbitals: Orbitals, members: list[int], zero: float) -> FrontierLevel:
    irreps, first = orbitals.irreps, members[0]
    return FrontierLevel(
        irrep="" if irreps is None else irreps.labels[first],
        irrep_share=float("nan") if irreps is None else float(irreps.label_shares[members].mean()),
        degeneracy=len(members),
        energy_eV=float(orbitals.energies_eV[members].mean()) - zero,
        electrons=float(orbitals.electrons[members].sum()),
        shell_share=float(orbitals.shell_shares[members].mean()),
    )


def _near(levels: tuple[FrontierLevel, ...], *, filled: bool) -> set[str]:
    """Irreps of the levels at the frontier on the filled or on the empty side."""
    side = [level for level in levels if (level.electrons > _HOLDS_ELECTRONS) == filled]
    if not side:
        return set()
    edge = max(level.energy_eV for level in side) if filled else min(level.energy_eV for level in side)
    return {level.irrep for level in side if abs(level.energy_eV - edge) <= NEAR_FRONTIER_EV}
