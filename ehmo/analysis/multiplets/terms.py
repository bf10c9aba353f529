"""Spin-free terms of an open shell in a ligand field."""

from __future__ import annotations

from dataclasses import dataclass
from functools import lru_cache

import numpy as np

from ehmo.analysis.multiplets.configurations import highest_spin_terms
from ehmo.analysis.multiplets.determinants import fermion_space
from ehmo.analysis.multiplets.groups import label_group
from ehmo.analysis.multiplets.irreps import (
    MOMENTUM_LETTERS,
    SortedBasis,
    component_sets,
    irrep_of_states,
    minors,
    momentum_basis,
    orbital_basis,
    term_basis,
)
from ehmo.analysis.multiplets.shells import check_shell, field_per_cm, slater_vector
from ehmo.analysis.multiplets.spin_adapted import SpinSpace, spin_spaces
from ehmo.conventions import SHELL_LETTERS
from ehmo.harmonics import harmonic_rotations
from ehmo.records.arrays import FloatArray, IntArray
from ehmo.records.multiplets import ElectronRepulsion, FieldLevel, Term, Terms
from ehmo.records.symmetry import PointGroup


def multiplet_terms(
    ligand_field_eV: FloatArray,
    n_electrons: int,
    repulsion: ElectronRepulsion | None,
    group: PointGroup | None = None,
    axes: FloatArray | None = None,
) -> Terms:
    """Terms of d1 to d9 and of f1 to f3 (f11 to f13) by full configuration interaction.

    Parameters
    ----------
    ligand_field_eV : (5, 5) or (7, 7) ndarray
        Ligand field among the real harmonics m = -l..l [eV].
    n_electrons : int
    repulsion : ElectronRepulsion or None
        None is enough for one electron or one hole.
    group : PointGroup, optional
        Group of the labels; C1 without it. The field need not have its symmetry exactly: see `Term.share`.
    axes : (3, 3) ndarray, optional
        Rows are the group's x, y, z in the coordinates of the harmonics; by default the same axes.

    Returns
    -------
    terms : Terms

    Raises
    ------
    MultipletError
        For an empty or full shell, f4 to f10, or a missing repulsion.
    ValueError
        If the field is not a symmetric matrix of the right size.

    Notes
    -----
    In a field that lowers the symmetry of the group, the states of an irrep are taken in the order of their
    energies, as many at a time as the irrep has dimensions.

    References
    ----------
    .. [1] tanabe-1954: Y. Tanabe, S. Sugano, J. Phys. Soc. Jpn. 9, 753 (1954) (from memory).
    """
    field = field_per_cm(ligand_field_eV)
    l = (len(field) - 1) // 2
    check_shell(l, n_electrons)
    integrals = slater_vector(l, n_electrons, repulsion)
    labels = label_group(group)
    if axes is not None:
        turn = harmonic_rotations(np.asarray(axes, dtype=np.float64).T[None], l)[0]
        field = turn.T @ field @ turn
    levels = _field_levels(field, orbital_basis(labels, l))
    parts = [
        _solve(space, term_basis(labels, space), field, integrals, levels) for space in spin_spaces(l, n_electrons)
    ]
    terms = _assemble(parts, levels)
    by_symmetry = highest_spin_terms(group, _unnumbered(labels, terms[0].configuration))
    return Terms(l, n_electrons, labels.name, levels.records, terms, by_symmetry)


def free_ion_terms(l: int, n_electrons: int, repulsion: ElectronRepulsion | None) -> Terms:
    """Terms 2S+1 L of the free ion.

    Parameters
    ----------
    l : int
        2 or 3.
    n_electrons : int
    repulsion : ElectronRepulsion or None
        None is enough for one electron or one hole.

    Returns
    -------
    terms : Terms

    Raises
    ------
    MultipletError
        For an empty or full shell, f4 to f10, or a missing repulsion.

    References
    ----------
    .. [1] racah-1942: G. Racah, Phys. Rev. 62, 438 (1942) (from memory).
    """
    check_shell(l, n_electrons)
    integrals = slater_vector(l, n_electrons, repulsion)
    n_orbitals = 2 * l + 1
    letter = SHELL_LETTERS[l]
    levels = _Levels((FieldLevel(letter, n_orbitals, 0.0, 1.0),), np.eye(n_orbitals), (0,) * n_orbitals)
    field = np.zeros((n_orbitals, n_orbitals))
    parts = [_solve(space, momentum_basis(space), field, integrals, levels) for space in spin_spaces(l, n_electrons)]
    terms = _assemble(parts, levels)
    return Terms(l, n_electrons, "free ion", levels.records, terms, (terms[0].label,))


@dataclass(frozen=True, slots=True, eq=False)
class _Levels:
    """Levels of the field with their orbitals as columns, and the level of each orbital."""

    records: tuple[FieldLevel, ...]
    orbitals: FloatArray
    of_orbital: tuple[int, ...]


def _field_levels(field: FloatArray, basis: SortedBasis) -> _Levels:
    energies, orbitals, shares = basis.solve(field)
    irreps = irrep_of_states(shares, basis.counts)
    order, starts = component_sets(irreps, basis.dimensions)
    set_irreps = irreps[order[starts]]
    sizes = basis.dimensions[set_irreps]
    means = _means(energies[order], starts, sizes)
    own = _means(shares[irreps[order], order], starts, sizes).tolist()
    rank = np.argsort(means, kind="stable").tolist()
    names = _numbered([basis.irreps[set_irreps[place]] for place in rank])
    records = tuple(
        FieldLevel(name, int(sizes[place]), float(means[place]), own[place])
        for name, place in zip(names, rank, strict=True)
    )
    columns = [column for place in rank for column in order[starts[place] : starts[place] + sizes[place]].tolist()]
    of_orbital = tuple(level for level, record in enumerate(records) for _ in range(record.degeneracy))
    return _Levels(records, orbitals[:, columns], of_orbital)


def _numbered(irreps: list[str]) -> list[str]:
    """Names of levels: an irrep that occurs more than once is numbered from below, such as 1e and 2e."""
    return [
        f"{irreps[: place + 1].count(irrep)}{irrep}" if irreps.count(irrep) > 1 else irrep
        for place, irrep in enumerate(irreps)
    ]


def _unnumbered(labels: PointGroup, configuration: tuple[tuple[str, int], ...]) -> list[tuple[str, int]]:
    """Configuration with bare irreps: the number before a repeated one is dropped."""
    return [(label if label in labels.irreps else label.lstrip("0123456789"), count) for label, count in configuration]


@dataclass(frozen=True, slots=True, eq=False)
class _SpinPart:
    """Terms of one spin as arrays, one entry per set of components.

    Components stand set after set; `patterns` are the occupations of the levels, `pattern_of` the heaviest of
    each set.
    """

    multiplicity: int
    irreps: list[str]
    energies: FloatArray
    starts: IntArray
    sizes: IntArray
    shares: FloatArray
    parents: list[str]
    parent_shares: FloatArray
    patterns: list[list[int]]
    pattern_of: IntArray
    pattern_shares: FloatArray


def _solve(
    space: SpinSpace, basis: SortedBasis, field: FloatArray, integrals: FloatArray, levels: _Levels
) -> _SpinPart:
    matrix = space.one_body(field) + np.tensordot(integrals, space.repulsion, axes=1)
    energies, vectors, shares = basis.solve(matrix)
    irreps = irrep_of_states(shares, basis.counts)
    order, starts = component_sets(irreps, basis.dimensions)
    set_irreps = irreps[order[starts]]
    sizes, sets = basis.dimensions[set_irreps], np.arange(len(starts))
    own = shares[irreps[order], order]
    momenta, first = space.distinct_momenta
    parents = _means(np.add.reduceat(vectors**2, first, axis=0)[:, order], starts, sizes)
    patterns, weights = _configuration_weights(space, vectors, levels)
    weights = _means(weights[:, order], starts, sizes)
    heaviest, pattern_of = parents.argmax(axis=0), weights.argmax(axis=0)
    return _SpinPart(
        space.two_s + 1,
        [basis.irreps[k] for k in set_irreps.tolist()],
        energies[order],
        starts,
        sizes,
        _means(own, starts, sizes),
        [MOMENTUM_LETTERS[momenta[k]] for k in heaviest.tolist()],
        parents[heaviest, sets],
        patterns,
        pattern_of,
        weights[pattern_of, sets],
    )


def _means(values: FloatArray, starts: IntArray, sizes: IntArray) -> FloatArray:
    """Mean over each set along the last axis."""
    means: FloatArray = np.add.reduceat(values, starts, axis=-1) / sizes
    return means


def _configuration_weights(
    space: SpinSpace, vectors: FloatArray, levels: _Levels
) -> tuple[list[list[int]], FloatArray]:
    """Occupations of the levels, pattern by pattern, and the weight of each pattern in each state."""
    patterns, indicator = _patterns(space, levels.of_orbital)
    if len(patterns) == 1:
        return patterns, np.ones((1, space.size))
    alpha, beta = minors(levels.orbitals, space.n_alpha), minors(levels.orbitals, space.n_beta)
    shaped = (space.vectors @ vectors).reshape(len(alpha), len(beta), -1)
    turned = np.tensordot(alpha.T, beta.T @ shaped, axes=1)
    weights: FloatArray = indicator @ (turned.reshape(-1, space.size) ** 2)
    return patterns, weights


@lru_cache(maxsize=256)
def _patterns(space: SpinSpace, of_orbital: tuple[int, ...]) -> tuple[list[list[int]], FloatArray]:
    """Distinct occupations of the levels, and which products of strings have each."""
    membership = np.eye(max(of_orbital) + 1)[list(of_orbital)]
    n_orbitals = 2 * space.l + 1
    alpha, beta = (fermion_space(n_orbitals, n).occupations @ membership for n in (space.n_alpha, space.n_beta))
    counts = (alpha[:, None] + beta[None]).reshape(-1, membership.shape[1])
    patterns, which = np.unique(counts, axis=0, return_inverse=True)
    return patterns.astype(int).tolist(), np.eye(len(patterns))[:, which.ravel()]


def _assemble(parts: list[_SpinPart], levels: _Levels) -> tuple[Term, ...]:
    """Terms of all spins by rising energy above the lowest state."""
    lowest = min(float(part.energies.min()) for part in parts)
    names = [level.label for level in levels.records]
    terms = []
    for part in parts:
        above = part.energies - lowest
        above.flags.writeable = False
        configurations = [tuple(zip(names, pattern, strict=True)) for pattern in part.patterns]
        rows = zip(
            part.irreps,
            part.starts.tolist(),
            part.sizes.tolist(),
            _means(above, part.starts, part.sizes).tolist(),
            part.shares.tolist(),
            part.parents,
            part.parent_shares.tolist(),
            part.pattern_of.tolist(),
            part.pattern_shares.tolist(),
            strict=True,
        )
        for irrep, start, size, energy, share, parent, parent_share, pattern, weight in rows:
            terms.append(
                Term(
                    label=f"{part.multiplicity}{irrep}",
                    multiplicity=part.multiplicity,
                    irrep=irrep,
                    degeneracy=size,
                    energy_per_cm=energy,
                    components_per_cm=above[start : start + size],
                    share=share,
                    parent=parent,
                    parent_share=parent_share,
                    configuration=configurations[pattern],
                    configuration_share=weight,
                )
            )
    return tuple(sorted(terms, key=lambda term: term.energy_per_cm))
