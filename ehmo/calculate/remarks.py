"""What a report says was assumed, and what to doubt."""

from __future__ import annotations

import numpy as np

from basis_params import ParameterTable
from ehmo.calculate.numbers import Bonding
from ehmo.conventions import FRONTIER_TOLERANCE_EV, atom_label
from ehmo.records.coordination import Coordination, ElectronAssignment
from ehmo.records.electronic import NO_ELECTRON, ElectronicState
from ehmo.records.fragment import Fragment
from ehmo.records.site import MetalSite
from ehmo.records.wording import signed

BOND_VALENCE_GAP = 0.5
"""Bond-valence sums that differ from the oxidation state by more are reported [valence units]."""


def assumptions(
    fragment: Fragment, coordination: Coordination, table: ParameterTable, electrons: ElectronAssignment
) -> tuple[str, ...]:
    """Sentences on charge, spin, ligands and parameters that were taken for granted."""
    said = [
        *fragment.notes,
        f"charge {signed(electrons.charge)}: {electrons.charge_reason}",
        f"unpaired electrons {electrons.unpaired_electrons}: {electrons.unpaired_reason}",
        *_ligand_charges(fragment, coordination),
    ]
    if table.inherited:
        keys = ", ".join(table.inherited)
        said.append(f"the table {table.name} does not state {keys}: taken from the standard set")
    return tuple(said)


def _ligand_charges(fragment: Fragment, coordination: Coordination) -> tuple[str, ...]:
    """Formal charge of each kind of ligand, with the donors or first atoms that carry it."""
    carriers: dict[tuple[str, int | None], list[str]] = {}
    for ligand in coordination.ligands:
        named = ligand.donors or ligand.atoms[:1]
        carriers.setdefault((ligand.formula, ligand.charge), []).append("/".join(fragment.labels[i] for i in named))
    parts = [f"{formula} {signed(charge)} ({', '.join(atoms)})" for (formula, charge), atoms in carriers.items()]
    return (f"ligand charges by counting: {', '.join(parts)}",) if parts else ()


def electronic_warnings(fragment: Fragment, coordination: Coordination, bonding: Bonding) -> tuple[str, ...]:
    """Sentences on a frontier or a spin density that casts doubt on the numbers."""
    return tuple(
        warning
        for warning in (
            _frontier_warning(bonding.state),
            _spin_warning(fragment, coordination, bonding),
        )
        if warning
    )


def site_warnings(fragment: Fragment, coordination: Coordination, sites: tuple[MetalSite, ...]) -> tuple[str, ...]:
    """Sentences on oxidation states that bond lengths contradict, on irregular spheres and on missing ladders."""
    said = []
    for site in sites:
        label = fragment.labels[site.metal]
        if site.bond_valence_sum is not None and site.oxidation_state is not None:
            gap = site.bond_valence_sum - site.oxidation_state
            if abs(gap) > BOND_VALENCE_GAP:
                said.append(
                    f"the bond-valence sum of {label} is {site.bond_valence_sum:.2f}, counting gives "
                    f"{site.oxidation_state}: check charge, hydrogens and the oxidation state"
                )
        if site.ladder_withheld:
            said.append(f"no ladder of {label}: {site.ladder_withheld}")
    doubtful = [ligand for ligand in coordination.ligands if ligand.charge is None and ligand.donors]
    said += [
        f"the charge of the ligand {ligand.formula} cannot be told ({ligand.charge_reason}): oxidation states are open"
        for ligand in doubtful
    ]
    return tuple(said)


def _electrons(count: float) -> str:
    return f"{count:g} electron{'' if round(count, 6) == 1 else 's'}"


def _frontier_warning(state: ElectronicState) -> str:
    occupations = state.occupations.sum(axis=0)
    part = (state.occupations > NO_ELECTRON) & (state.occupations < 1 - NO_ELECTRON)
    shared = np.flatnonzero(part.any(axis=0))
    if len(shared):
        levels = ", ".join(str(k + 1) for k in shared)
        if state.smearing_eV:
            held = _electrons(round(float(occupations[shared].sum()), 1))
            return (
                f"orbitals {levels} cross as the charges settle: they share {held} by a filling smeared over "
                f"{state.smearing_eV:g} eV; the ground state is nearly degenerate and may distort"
            )
        return (
            f"orbitals {levels} are degenerate and share {_electrons(occupations[shared].sum())} evenly: "
            "the ground state may distort"
        )
    lumo = state.lumo
    if lumo is None:
        return ""
    gap = state.energies_eV[lumo] - state.energies_eV[lumo - 1]
    if gap < FRONTIER_TOLERANCE_EV:
        return (
            f"orbitals {lumo} and {lumo + 1} at the frontier are only {gap:.3f} eV apart: another filling is as likely"
        )
    return ""


def _spin_warning(fragment: Fragment, coordination: Coordination, bonding: Bonding) -> str:
    unpaired = fragment.unpaired_electrons
    if not unpaired:
        return ""
    on_metal = bonding.populations.spin[list(coordination.metals)].sum() / unpaired
    if on_metal >= 0.5:
        return ""
    difference = bonding.state.occupations[0] - bonding.state.occupations[1]
    worst = int((difference * (1 - bonding.populations.orbital_shares[:, 0])).argmax())
    coefficients = bonding.state.coefficients[:, worst]
    gross = coefficients * (bonding.overlap.matrix @ coefficients)
    atom = int(np.add.reduceat(gross, bonding.plan.basis.atom_start[:-1]).argmax())
    return (
        f"only {100 * on_metal:.0f} % of the unpaired density is on the metal: orbital {worst + 1} holds an unpaired "
        f"electron and has its largest part on {atom_label(fragment.symbols[atom], atom)}; check the spin state"
    )
