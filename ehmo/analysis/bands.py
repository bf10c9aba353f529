"""Absorption bands: between terms of the d (f) shell, and of charge transfer between orbitals."""

from __future__ import annotations

from collections.abc import Sequence
from dataclasses import dataclass

import numpy as np

from ehmo.analysis.multiplets import configuration_terms, dipole_polarisations
from ehmo.conventions import DEGENERACY_TOLERANCE_EV
from ehmo.records.arrays import FloatArray, IntArray
from ehmo.records.bands import Band, BandKind, TransferDirection
from ehmo.records.electronic import NO_ELECTRON, ElectronicState
from ehmo.records.ligand_field import Ladder
from ehmo.records.multiplets import Term, Terms
from ehmo.records.symmetry import PointGroup
from ehmo.units import BOHR_A, HARTREE_EV, PER_CM_PER_EV

CHARGE_TRANSFER_WINDOW_EV = 7.5
"""Charge-transfer bands beyond this are not listed: 60,000 cm^-1 is where air absorbs [eV]."""

LISTED_STRENGTH = 1e-3
"""Charge-transfer bands of less oscillator strength are left out, but for the lowest ones."""

ALLOWED_STRENGTH = 1e-4
"""Charge-transfer bands of less are called forbidden, unless the group of the sphere allows them."""

SAME_TERM_PER_CM = 1.0
"""Terms closer than this are told apart by rounding alone [cm^-1]."""

MOVED_SHARE = 0.2
"""Part of an electron that must change between metal and ligands for a band to be called LMCT or MLCT."""

_LOWEST_LISTED = 3
_WEAK_STRENGTH = 1e-8  # strengths below are rounding of what symmetry forbids, or of no weight at all
_NOTHING = 1e-12  # strengths below are rounding
_POLARISED = 0.15  # share of the intensity along an axis that is worth its letter


def shell_bands(
    terms: Terms, ground: Term, group: PointGroup | None, ladder: Ladder, dipoles_A: FloatArray
) -> tuple[Band, ...]:
    """Bands from the ground term to every term above it.

    Parameters
    ----------
    terms : Terms
        Terms of the shell, labelled in the group.
    ground : Term
        Lowest term of the spin that the fragment has.
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
    strengths = (dipoles_A**2).sum(axis=0)
    bands = []
    for term in terms.terms[terms.terms.index(ground) + 1 :]:
        if term.energy_per_cm - ground.energy_per_cm < SAME_TERM_PER_CM:
            continue
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
    before = dict(ground.configuration)
    # Electrons of the source times the share of free spin orbitals of the target.
    electrons = before[source] / len(sets[source]) * (1 - before[target] / (2 * len(sets[target])))
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
    metal_shares: FloatArray,
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
    metal_shares : (n_mo,) ndarray
        Share of each orbital on the metals.

    Returns
    -------
    bands : tuple of Band
        By rising energy, which is the gap of the orbitals. Degenerate orbitals are taken together.

    References
    ----------
    .. [1] mulliken-1939: R. S. Mulliken, J. Chem. Phys. 7, 14 (1939): f = (2/3) dE |D|^2 in atomic units.
    """
    rows, columns = _movable_orbitals(state)
    moments = np.einsum(
        "pi,kpq,qj->kij", state.coefficients[:, rows], dipoles_A, state.coefficients[:, columns], optimize=True
    )
    moments = np.tensordot(axes, moments, axes=1)
    squared = moments**2 * np.einsum("si,sj->ij", state.occupations[:, rows], 1 - state.occupations[:, columns])
    sources, targets = _set_starts(state, labels, rows), _set_starts(state, labels, columns)
    by_axis = np.add.reduceat(np.add.reduceat(squared, sources, axis=1), targets, axis=2)
    gaps = state.energies_eV[columns[targets]] - state.energies_eV[rows[sources]][:, None]
    strengths = 2 / 3 * gaps / HARTREE_EV * by_axis.sum(axis=0) / BOHR_A**2
    strengths[strengths < _NOTHING] = 0.0
    ladder = np.array(sorted(ladder_orbitals), dtype=np.intp)
    within = np.isin(rows[sources], ladder)[:, None] & np.isin(columns[targets], ladder)
    possible = (gaps > DEGENERACY_TOLERANCE_EV) & (gaps < CHARGE_TRANSFER_WINDOW_EV) & ~within
    first, second = np.nonzero(possible)
    order = np.argsort(gaps[first, second], kind="stable")
    first, second = first[order], second[order]
    listed = (strengths[first, second] >= LISTED_STRENGTH) | (np.arange(len(first)) < _LOWEST_LISTED)
    closed_shell = bool(np.allclose(state.occupations[0], state.occupations[1]))
    given, taken = _set_means(metal_shares[rows], sources), _set_means(metal_shares[columns], targets)
    bands = []
    for source, target in zip(first[listed].tolist(), second[listed].tolist(), strict=True):
        transfer = _Transfer(
            _members(rows, sources, source),
            _members(columns, targets, target),
            float(gaps[source, target]),
            float(strengths[source, target]),
            by_axis[:, source, target],
            given[source],
            taken[target],
        )
        bands.append(_transfer_band(labels, transfer, closed_shell=closed_shell))
    return tuple(bands)


@dataclass(frozen=True, slots=True, eq=False)
class _Transfer:
    """Electrons moved from one set of orbitals to another."""

    source: IntArray
    target: IntArray
    gap_eV: float
    strength: float
    by_axis: FloatArray
    share_before: float
    share_after: float
    """Metal share of the set that gives and of the one that takes the electron."""


def transfer_direction(before: float, after: float) -> TransferDirection:
    """Name of a transfer by the metal share of the electron before and after it.

    Parameters
    ----------
    before, after : float
        Shares of the orbitals on the metal.

    Returns
    -------
    direction : TransferDirection
        LMCT or MLCT where at least `MOVED_SHARE` of an electron moves, else by where most of it stays.

    Examples
    --------
    >>> transfer_direction(0.05, 0.60), transfer_direction(0.70, 0.10), transfer_direction(0.05, 0.10)
    ('LMCT', 'MLCT', 'intraligand')
    """
    if abs(after - before) >= MOVED_SHARE:
        return "LMCT" if after > before else "MLCT"
    return "metal-centred" if before + after > 1 else "intraligand"


def _movable_orbitals(state: ElectronicState) -> tuple[IntArray, IntArray]:
    """Orbitals that can lose and that can take an electron within the window."""
    energies, (alpha, beta) = state.energies_eV, state.occupations
    filled, open_ = alpha > NO_ELECTRON, beta < 1 - NO_ELECTRON
    lowest_open = energies[open_][0] if open_.any() else np.inf
    rows = np.flatnonzero(filled & (energies > lowest_open - CHARGE_TRANSFER_WINDOW_EV))
    columns = np.flatnonzero(open_ & (energies < energies[filled][-1] + CHARGE_TRANSFER_WINDOW_EV))
    return rows, columns


def _set_starts(state: ElectronicState, labels: OrbitalLabels, orbitals: IntArray) -> IntArray:
    """Places in a list of orbitals where a new energy or irrep begins."""
    if not len(orbitals):
        return orbitals
    names = np.array([labels.irreps[k] for k in orbitals])
    gap = np.diff(state.energies_eV[orbitals]) > 10 * DEGENERACY_TOLERANCE_EV
    return np.concatenate([[0], 1 + np.flatnonzero(gap | (names[1:] != names[:-1]))])


def _set_means(values: FloatArray, starts: IntArray) -> list[float]:
    """Mean of each set of neighbours."""
    if not len(starts):
        return []
    means: list[float] = (np.add.reduceat(values, starts) / np.diff(starts, append=len(values))).tolist()
    return means


def _members(orbitals: IntArray, starts: IntArray, place: int) -> IntArray:
    stop = starts[place + 1] if place + 1 < len(starts) else len(orbitals)
    return orbitals[starts[place] : stop]


def _transfer_band(labels: OrbitalLabels, transfer: _Transfer, *, closed_shell: bool) -> Band:
    source, target = transfer.source, transfer.target
    lower, upper = labels.irreps[source[0]], labels.irreps[target[0]]
    allowed = transfer.strength >= ALLOWED_STRENGTH or (
        transfer.strength >= _WEAK_STRENGTH and _allowed_by_symmetry(labels.group, lower, upper)
    )
    weak = _POLARISED * transfer.by_axis.sum()
    letters = [letter for letter, part in zip("xyz", transfer.by_axis, strict=True) if allowed and part > weak]
    return Band(
        "charge transfer",
        transfer.gap_eV * PER_CM_PER_EV,
        " ".join(f"{int(source[0]) + 1} {lower} to {int(target[0]) + 1} {upper}".split()),
        _singlets(labels.group, (lower, len(source)), (upper, len(target))) if closed_shell else "",
        len(source) * len(target),
        True,
        allowed,
        ", ".join(letters),
        transfer.strength,
        (int(source[0]), int(target[0])),
        transfer_direction(transfer.share_before, transfer.share_after),
        transfer.share_after - transfer.share_before,
    )


def _allowed_by_symmetry(group: PointGroup | None, lower: str, upper: str) -> bool:
    """Whether the product of two irreps holds that of an axis; not so without labels."""
    if group is None or lower not in group.irreps or upper not in group.irreps:
        return False
    capitals = dict(zip(group.irreps, group.term_irreps, strict=True))
    return bool(dipole_polarisations(group, capitals[lower], capitals[upper]))


def _singlets(group: PointGroup | None, lower: tuple[str, int], upper: tuple[str, int]) -> str:
    """Singlets of a hole and an electron, where both sets are whole in the group."""
    if group is None:
        return ""
    dimensions = dict(zip(group.irreps, group.dimensions.tolist(), strict=True))
    if dimensions.get(lower[0]) != lower[1] or dimensions.get(upper[0]) != upper[1]:
        return ""
    terms = configuration_terms(group, [(lower[0], 2 * lower[1] - 1), (upper[0], 1)])
    return " + ".join(f"1{irrep}" for multiplicity, irrep, _ in terms if multiplicity == 1)
