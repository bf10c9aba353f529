"""What a report says was assumed, and what to doubt."""

from __future__ import annotations

import numpy as np

from basis_params import ParameterTable
from ehmo.calculate.numbers import Bonding
from ehmo.conventions import FRONTIER_TOLERANCE_EV, atom_label
from ehmo.records.arrays import FloatArray
from ehmo.records.coordination import Coordination, ElectronAssignment
from ehmo.records.electronic import NO_ELECTRON, ElectronicState
from ehmo.records.fragment import Fragment
from ehmo.records.site import MetalSite, Spectroscopy
from ehmo.records.wording import signed

GUESS_GAP_EV = 0.5
"""A closed-shell ion whose guessed charge leaves a smaller gap is doubtful [eV]."""

MOSTLY_LIGAND = 0.3
"""Orbitals with less metal share lie on ligands."""

COUNT_GAP = 0.5
"""Electrons by which ladder and counting may differ."""

STRONG_COUPLING = 0.2
"""Ratio of the spin-orbit constant to the first excited term from which first-order g values fail."""

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
    said += calibrated_range(fragment, coordination, table)
    if table.inherited:
        keys = ", ".join(table.inherited)
        said.append(f"the table {table.name} does not state {keys}: taken from the standard set")
    return tuple(said)


def calibrated_range(fragment: Fragment, coordination: Coordination, table: ParameterTable) -> tuple[str, ...]:
    """For a set with two-body terms, which bonds lie in the range of lengths that it was fitted to; else nothing."""
    if not table.repulsion:
        return ()
    inside, outside, missing = [], [], []
    for bond in coordination.bonds:
        ends = fragment.symbols[bond.metal], fragment.symbols[bond.donor]
        label = f"{fragment.labels[bond.metal]}-{fragment.labels[bond.donor]}"
        term = table.pair_repulsion(*ends)
        if term is None:
            missing.append("-".join(ends))
        elif term.covers(bond.length_A):
            inside.append(label)
        else:
            outside.append(f"{label} ({term.label} {term.lowest_A:g} to {term.highest_A:g} Å)")
    parts = [
        f"{words} {', '.join(dict.fromkeys(names))}"
        for words, names in (
            ("within its calibrated range of lengths", inside),
            ("outside it", outside),
            ("no lengths of", missing),
        )
        if names
    ]
    return (f"set {table.name}: {'; '.join(parts)}",) if parts else ()


def _ligand_charges(fragment: Fragment, coordination: Coordination) -> tuple[str, ...]:
    """Formal charge of each kind of ligand, with the donors or first atoms that carry it."""
    carriers: dict[tuple[str, int | None], list[str]] = {}
    for ligand in coordination.ligands:
        named = ligand.donors or ligand.atoms[:1]
        carriers.setdefault((ligand.formula, ligand.charge), []).append("/".join(fragment.labels[i] for i in named))
    parts = [f"{formula} {signed(charge)} ({', '.join(atoms)})" for (formula, charge), atoms in carriers.items()]
    return (f"ligand charges by counting: {', '.join(parts)}",) if parts else ()


def electronic_warnings(
    fragment: Fragment, coordination: Coordination, electrons: ElectronAssignment, bonding: Bonding
) -> tuple[str, ...]:
    """Sentences on a frontier or a spin density that casts doubt on the numbers."""
    return tuple(
        warning
        for warning in (
            electrons.spin_doubt and f"the spin state may be another one: {electrons.spin_doubt}",
            _guess_warning(electrons, bonding.state),
            _frontier_warning(bonding.state, bonding.populations.orbital_shares[:, 0]),
            _spin_warning(fragment, coordination, bonding),
        )
        if warning
    )


def site_warnings(
    fragment: Fragment, coordination: Coordination, sites: tuple[MetalSite, ...], oxidation_total: int | None
) -> tuple[str, ...]:
    """Sentences on oxidation states that bond lengths contradict, on irregular spheres and on missing ladders."""
    said = _mean_state_warning(fragment, sites, oxidation_total)
    for site in sites:
        label = fragment.labels[site.metal]
        if site.bond_valence_sum is not None and site.oxidation_state is not None:
            gap = site.bond_valence_sum - site.oxidation_state
            if abs(gap) > BOND_VALENCE_GAP:
                said.append(
                    f"the bond-valence sum of {label} is {site.bond_valence_sum:.2f}, counting gives "
                    f"{site.oxidation_state}: check charge, hydrogens and the oxidation state"
                )
        if site.ladder is not None and site.d_count is not None and len(sites) == 1:
            held = sum(level.electrons for level in site.ladder.levels)
            if abs(held - site.d_count) >= COUNT_GAP:
                said.append(
                    f"the ladder of {label} holds {held:.1f} electrons, counting gives {site.d_count}: check the "
                    "charge and the oxidation state"
                )
        if site.ladder_withheld:
            said.append(f"no ladder of {label}: {site.ladder_withheld}")
    if all(site.oxidation_state is None for site in sites):
        doubtful = [ligand for ligand in coordination.ligands if ligand.charge is None and ligand.donors]
        said += [
            f"the charge of the ligand {ligand.formula} cannot be told ({ligand.charge_reason}): the oxidation state "
            "is open; give it with --oxidation-state"
            for ligand in {ligand.formula: ligand for ligand in doubtful}.values()
        ]
    return tuple(said)


def _mean_state_warning(fragment: Fragment, sites: tuple[MetalSite, ...], oxidation_total: int | None) -> list[str]:
    """Sentence on metals of one element whose bond-valence sums contradict their mean oxidation state."""
    if len(sites) == 1 or oxidation_total is None or len({fragment.symbols[site.metal] for site in sites}) > 1:
        return []
    mean = oxidation_total / len(sites)
    sums = [(fragment.labels[site.metal], site.bond_valence_sum) for site in sites if site.bond_valence_sum is not None]
    far = [(label, total) for label, total in sums if abs(total - mean) > BOND_VALENCE_GAP]
    if not far:
        return []
    low, high = (f"{extreme(total for _, total in far):.2f}" for extreme in (min, max))
    several = f"sums of {', '.join(label for label, _ in far)} are" if len(far) > 1 else f"sum of {far[0][0]} is"
    return [
        f"the bond-valence {several} {low if low == high else f'{low} to {high}'}, counting gives {mean:.3g} on the "
        "average: check charge, hydrogens and the oxidation states"
    ]


def spectrum_warnings(spectrum: Spectroscopy) -> tuple[str, ...]:
    """Sentences on a ground term or g values that the computed ladder does not bear out."""
    said = []
    terms = spectrum.terms
    alike = spectrum.ground_term.split(" or ")
    if len(alike) > 1:
        said.append(
            f"the terms {spectrum.ground_term} are degenerate within the calculation: either may be the ground term"
        )
    if terms is not None and spectrum.ground_term and terms.ground.label not in alike:
        ground = next(term for term in terms.terms if term.label in alike)
        said.append(
            f"the lowest term of the computed ladder is {terms.ground.label}, {ground.energy_per_cm:.0f} cm-1 below "
            f"{spectrum.ground_term}, the lowest with the spin of the calculation: bands and spin rest on a ladder "
            "that may be too wide"
        )
    constants = spectrum.constants
    if spectrum.magnetism is not None and constants is not None and constants.zeta_per_cm and spectrum.bands:
        first = min((b.wavenumber_per_cm for b in spectrum.bands if b.kind != "charge transfer"), default=0.0)
        if 0 < first < constants.zeta_per_cm / STRONG_COUPLING:
            said.append(
                f"spin-orbit coupling of {constants.ion}, {constants.zeta_per_cm:.0f} cm-1, is strong against the "
                f"first excited term at {first:.0f} cm-1: g values are rough"
            )
    return tuple(said)


def _electrons(count: float) -> str:
    return f"{count:g} electron{'' if round(count, 6) == 1 else 's'}"


def _guess_warning(electrons: ElectronAssignment, state: ElectronicState) -> str:
    """A guessed charge that leaves hardly a gap is likely to be a wrong one."""
    if not electrons.charge_reason.startswith("guessed") or state.lumo is None:
        return ""
    gap = float(state.energies_eV[state.lumo] - state.energies_eV[state.lumo - 1])
    if gap >= GUESS_GAP_EV or electrons.unpaired_electrons:
        return ""
    return f"the guessed charge {signed(electrons.charge)} leaves a gap of only {gap:.2f} eV: give the charge"


def _frontier_warning(state: ElectronicState, metal_share: FloatArray) -> str:
    occupations = state.occupations.sum(axis=0)
    part = (state.occupations > NO_ELECTRON) & (state.occupations < 1 - NO_ELECTRON)
    shared = np.flatnonzero(part.any(axis=0))
    if len(shared):
        levels = ", ".join(str(k + 1) for k in shared)
        if state.smearing_eV:
            held = _electrons(round(float(occupations[shared].sum()), 1))
            if metal_share[shared].min() < MOSTLY_LIGAND:
                return (
                    f"orbitals {levels}, of the metal and of ligands, cross as the charges settle: they share {held} "
                    f"by a filling smeared over {state.smearing_eV:g} eV; compare with --charges fixed"
                )
            return (
                f"orbitals {levels} cross as the charges settle: they share {held} by a filling smeared over "
                f"{state.smearing_eV:g} eV; the ground state is nearly degenerate and may distort"
            )
        return (
            f"orbitals {levels} are degenerate and share {_electrons(occupations[shared].sum())} evenly: "
            "the ground state may distort"
        )
    for filling in state.occupations:
        empty = int((filling > NO_ELECTRON).sum())
        if not 0 < empty < len(filling):
            continue
        gap = state.energies_eV[empty] - state.energies_eV[empty - 1]
        if gap < FRONTIER_TOLERANCE_EV:
            return (
                f"orbitals {empty} and {empty + 1} at the frontier are only {gap:.3f} eV apart: "
                "another filling is as likely"
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
    label = atom_label(fragment.symbols[atom], atom)
    mend = "it is shared with the ligands" if atom in coordination.metals else f"check the spin state: {label} has most"
    return (
        f"only {100 * on_metal:.0f} % of the unpaired density is on the metal, most of the rest in orbital "
        f"{worst + 1}: {mend}"
    )
