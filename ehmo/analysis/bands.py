"""Absorption bands: between terms of the d (f) shell, and of charge transfer between orbitals."""

from __future__ import annotations

from collections.abc import Sequence
from dataclasses import dataclass

import numpy as np

from ehmo.analysis.multiplets import configuration_terms, dipole_polarisations
from ehmo.conventions import DEGENERACY_TOLERANCE_EV
from ehmo.records.arrays import FloatArray, IntArray
from ehmo.records.bands import Band, BandKind
from ehmo.records.electronic import ElectronicState
from ehmo.records.ligand_field import Ladder
from ehmo.records.multiplets import Term, Terms
from ehmo.records.symmetry import PointGroup
from ehmo.units import BOHR_A, HARTREE_EV, PER_CM_PER_EV

CHARGE_TRANSFER_WINDOW_EV = 7.5
"""Charge-transfer bands beyond this are not listed: 60,000 cm^-1 is where air absorbs [eV]."""

LISTED_STRENGTH = 1e-3
"""Charge-transfer bands of less oscillator strength are left out, but for the lowest ones."""

ALLOWED_STRENGTH = 1e-4
"""Charge-transfer bands of less are called forbidden."""

_LOWEST_LISTED = 3
_POLARISED = 0.15  # share of the intensity along an axis that is worth its letter


def shell_bands(terms: Terms, group: PointGroup | None, ladder: Ladder, dipoles_A: FloatArray) -> tuple[Band, ...]:
    """Bands from the ground term to every other term.

    Parameters
    ----------
    terms : Terms
        Terms of the shell, labelled in the group.
    group : PointGroup or None
        Group of the labels.
    ladder : Ladder
        Levels whose orbitals carry the electrons.
    dipoles_A : (3, n, n) ndarray
        Dipole matrices among the orbitals of the levels [angstrom].

    Returns
    -------
    bands : tuple of Band
        By rising wavenumber. The oscillator strength of a spin- and dipole-allowed band is that of one electron
        between the two levels, times the weight of that configuration.
    """
    kind: BandKind = "d-d" if terms.l == 2 else "f-f"
    ground = terms.ground
    strengths = (dipoles_A**2).sum(axis=0)
    bands = []
    for term in terms.terms[1:]:
        spin_allowed = term.multiplicity == ground.multiplicity
        polarisation = dipole_polarisations(group, ground.irrep, term.irrep)
        strength = None
        if spin_allowed and polarisation:
            strength = _jump_strength(ground, term, terms, ladder, strengths)
        bands.append(
            Band(
                kind,
                term.energy_per_cm - ground.energy_per_cm,
                _jump_in_words(ground, term),
                term.label,
                term.degeneracy,
                spin_allowed,
                bool(polarisation),
                ", ".join(polarisation),
                strength,
            )
        )
    return tuple(bands)


def _jumps(ground: Term, upper: Term) -> list[tuple[str, int]]:
    """Change of occupation of each level that changes."""
    before = dict(ground.configuration)
    return [(level, count - before[level]) for level, count in upper.configuration if count != before[level]]


def _jump_in_words(ground: Term, upper: Term) -> str:
    jumps = _jumps(ground, upper)
    left = [level for level, change in jumps for _ in range(-change)]
    taken = [level for level, change in jumps for _ in range(change)]
    return f"{' '.join(left)} to {' '.join(taken)}" if jumps else "within the configuration"


def _jump_strength(ground: Term, upper: Term, terms: Terms, ladder: Ladder, strengths: FloatArray) -> float | None:
    """Oscillator strength (2/3) dE |D|^2 in atomic units, for one electron from one level to another."""
    jumps = _jumps(ground, upper)
    if sorted(change for _, change in jumps) != [-1, 1]:
        return None
    sets = _level_orbitals(terms, ladder)
    source = next(level for level, change in jumps if change < 0)
    target = next(level for level, change in jumps if change > 0)
    electrons = dict(ground.configuration)[source] / len(sets[source])
    squared = float(strengths[np.ix_(sets[source], sets[target])].sum()) * electrons / BOHR_A**2
    energy = (upper.energy_per_cm - ground.energy_per_cm) / PER_CM_PER_EV / HARTREE_EV
    return 2 / 3 * energy * squared * ground.configuration_share * upper.configuration_share


def _level_orbitals(terms: Terms, ladder: Ladder) -> dict[str, list[int]]:
    """Places in the ladder of each level of the field: both run by energy, and sets stay together."""
    energies = np.array([level.energy_eV for level in ladder.levels]) * PER_CM_PER_EV
    energies -= energies.mean()
    free = list(range(len(energies)))
    sets: dict[str, list[int]] = {}
    for level in terms.levels:
        free.sort(key=lambda place: abs(energies[place] - level.energy_per_cm))
        sets[level.label], free = sorted(free[: level.degeneracy]), free[level.degeneracy :]
    return sets


@dataclass(frozen=True, slots=True, eq=False)
class OrbitalLabels:
    """Irrep of every molecular orbital in one group.

    Attributes
    ----------
    group : PointGroup or None
    irreps : tuple of str
    """

    group: PointGroup | None
    irreps: tuple[str, ...]


def charge_transfer_bands(
    state: ElectronicState,
    labels: OrbitalLabels,
    ladder_orbitals: Sequence[int],
    dipoles_A: FloatArray,
    axes: FloatArray,
) -> tuple[Band, ...]:
    """Bands between orbitals, at least one of which is no level of the ladder.

    Parameters
    ----------
    state : ElectronicState
        Orbitals and their filling.
    labels : OrbitalLabels
        Their irreps.
    ladder_orbitals : sequence of int
        Orbitals of the ladder; transitions among them are left to the terms.
    dipoles_A : (3, n_ao, n_ao) ndarray
        Dipole integrals of the basis functions [angstrom].
    axes : (3, 3) ndarray
        Rows x, y, z of the polarisation.

    Returns
    -------
    bands : tuple of Band
        By rising energy, which is the gap of the orbitals. Degenerate orbitals are taken together.

    References
    ----------
    .. [1] mulliken-1939: R. S. Mulliken, J. Chem. Phys. 7, 14 (1939): f = (2/3) dE |D|^2 in atomic units.
    """
    sets = _orbital_sets(state, labels)
    bands = []
    highest, lowest = state.energies_eV[state.homo], state.energies_eV[_first_open(state)]
    sources = [
        s
        for s in sets
        if state.occupations[0, s[0]] > 0.01 and lowest - state.energies_eV[s[0]] < CHARGE_TRANSFER_WINDOW_EV
    ]
    targets = [
        s
        for s in sets
        if state.occupations[1, s[0]] < 0.99 and state.energies_eV[s[0]] - highest < CHARGE_TRANSFER_WINDOW_EV
    ]
    columns = np.concatenate(targets) if targets else np.zeros(0, dtype=np.intp)
    rows = np.concatenate(sources) if sources else np.zeros(0, dtype=np.intp)
    moments = np.einsum(
        "pi,kpq,qj->kij", state.coefficients[:, rows], dipoles_A, state.coefficients[:, columns], optimize=True
    )
    moments = np.tensordot(axes, moments, axes=1)
    places = {int(orbital): place for place, orbital in enumerate(rows)}, {int(o): p for p, o in enumerate(columns)}
    ladder = frozenset(ladder_orbitals)
    for source in sources:
        for target in targets:
            gap = float(state.energies_eV[target].mean() - state.energies_eV[source].mean())
            if not DEGENERACY_TOLERANCE_EV < gap < CHARGE_TRANSFER_WINDOW_EV:
                continue
            if ladder.issuperset(source.tolist()) and ladder.issuperset(target.tolist()):
                continue
            i, j = ([place[int(o)] for o in orbitals] for place, orbitals in zip(places, (source, target), strict=True))
            squared = (moments[:, i][:, :, j] ** 2 * _movable(state, source, target)).sum(axis=(1, 2))
            strength = 2 / 3 * gap / HARTREE_EV * float(squared.sum()) / BOHR_A**2
            bands.append(_transfer_band(state, labels, source, target, gap, strength, squared))
    bands.sort(key=lambda band: band.wavenumber_per_cm)
    return tuple(
        band
        for place, band in enumerate(bands)
        if place < _LOWEST_LISTED or (band.oscillator_strength or 0.0) >= LISTED_STRENGTH
    )


def _first_open(state: ElectronicState) -> int:
    """Lowest orbital with room for an electron."""
    return int(np.flatnonzero(state.occupations[1] < 0.99)[0])


def _movable(state: ElectronicState, source: IntArray, target: IntArray) -> FloatArray:
    """Electrons that can move from each source to each target orbital, spin by spin."""
    filled, room = state.occupations[:, source], 1 - state.occupations[:, target]
    electrons: FloatArray = np.einsum("si,sj->ij", filled, room)
    return electrons


def _orbital_sets(state: ElectronicState, labels: OrbitalLabels) -> list[IntArray]:
    """Orbitals of one energy and irrep."""
    sets: list[list[int]] = []
    for k, energy in enumerate(state.energies_eV):
        if (
            sets
            and energy - state.energies_eV[sets[-1][-1]] < 10 * DEGENERACY_TOLERANCE_EV
            and (labels.irreps[k] == labels.irreps[sets[-1][-1]])
        ):
            sets[-1].append(k)
        else:
            sets.append([k])
    return [np.array(members, dtype=np.intp) for members in sets]


def _transfer_band(
    state: ElectronicState,
    labels: OrbitalLabels,
    source: IntArray,
    target: IntArray,
    gap: float,
    strength: float,
    by_axis: FloatArray,
) -> Band:
    lower, upper = labels.irreps[source[0]], labels.irreps[target[0]]
    allowed = strength >= ALLOWED_STRENGTH
    letters = [
        letter for letter, part in zip("xyz", by_axis, strict=True) if allowed and part > _POLARISED * by_axis.sum()
    ]
    return Band(
        "charge transfer",
        gap * PER_CM_PER_EV,
        f"{int(source[0]) + 1} {lower} to {int(target[0]) + 1} {upper}",
        _closed_shell_terms(state, labels.group, (lower, len(source)), (upper, len(target))),
        len(source) * len(target),
        True,
        allowed,
        ", ".join(letters),
        strength,
    )


def _closed_shell_terms(
    state: ElectronicState, group: PointGroup | None, lower: tuple[str, int], upper: tuple[str, int]
) -> str:
    """Singlets of a hole and an electron; an open-shell ground state makes too many terms to name."""
    if group is None or not np.allclose(state.occupations[0], state.occupations[1]):
        return ""
    dimensions = dict(zip(group.irreps, group.dimensions.tolist(), strict=True))
    if dimensions.get(lower[0]) != lower[1] or dimensions.get(upper[0]) != upper[1]:
        return ""
    terms = configuration_terms(group, [(lower[0], 2 * lower[1] - 1), (upper[0], 1)])
    return " + ".join(f"1{irrep}" for multiplicity, irrep, _ in terms if multiplicity == 1)
