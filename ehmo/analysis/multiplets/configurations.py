"""Configurations: the terms that symmetry alone allows, and dipole rules between terms."""

from __future__ import annotations

from collections.abc import Sequence
from functools import lru_cache

import numpy as np

from ehmo.analysis.multiplets.groups import label_group, operation_powers
from ehmo.errors import MultipletError
from ehmo.records.arrays import FloatArray
from ehmo.records.symmetry import PointGroup


def configuration_terms(
    group: PointGroup | None, configuration: Sequence[tuple[str, int]]
) -> tuple[tuple[int, str, int], ...]:
    """Terms of a configuration by direct products and the Pauli principle.

    Parameters
    ----------
    group : PointGroup or None
        None stands for C1.
    configuration : sequence of (str, int)
        Irrep (small letters) and electrons of each level.

    Returns
    -------
    terms : tuple of (multiplicity, irrep, count)
        Highest spin first; irreps in capitals.

    Raises
    ------
    MultipletError
        If an irrep is unknown or holds fewer electrons than asked for.

    Notes
    -----
    With a alpha and b beta electrons a level spans the product of the a-th and b-th exterior powers of its
    irrep, whose characters follow from those of g, g^2, .. by Newton's identities. What appears at M_S = S but
    not at S + 1 has spin S.

    References
    ----------
    .. [1] griffith-1961: J. S. Griffith, The Theory of Transition-Metal Ions, Cambridge 1961 (from memory).
    """
    return _allowed_terms(label_group(group), tuple((irrep, count) for irrep, count in configuration))


@lru_cache(maxsize=1024)
def _allowed_terms(labels: PointGroup, configuration: tuple[tuple[str, int], ...]) -> tuple[tuple[int, str, int], ...]:
    blocks = {0: np.ones(len(labels.operations))}
    for irrep, n_electrons in configuration:
        blocks = _coupled(blocks, _spin_blocks(labels, irrep, n_electrons))
    terms = []
    for two_s in sorted((two_m for two_m in blocks if two_m >= 0), reverse=True):
        counts = labels.multiplicities(blocks[two_s] - blocks.get(two_s + 2, 0.0))
        terms += [
            (two_s + 1, irrep, int(count)) for irrep, count in zip(labels.term_irreps, counts, strict=True) if count
        ]
    return tuple(terms)


def highest_spin_terms(group: PointGroup | None, configuration: Sequence[tuple[str, int]]) -> tuple[str, ...]:
    """Labels of the terms of highest spin of a configuration, such as ``3T1g``; see `configuration_terms`."""
    terms = configuration_terms(group, configuration)
    return tuple(f"{mult}{irrep}" for mult, irrep, count in terms for _ in range(count) if mult == terms[0][0])


def _spin_blocks(labels: PointGroup, irrep: str, n_electrons: int) -> dict[int, FloatArray]:
    """Characters of one level by 2 M_S."""
    if irrep not in labels.irreps:
        raise MultipletError(f"{labels.name} has no irrep {irrep!r}", mend=f"use one of {', '.join(labels.irreps)}")
    place = labels.irreps.index(irrep)
    dimension = int(labels.dimensions[place])
    if not 0 <= n_electrons <= 2 * dimension:
        raise MultipletError(f"{irrep} holds at most {2 * dimension} electrons, not {n_electrons}")
    powers = _exterior_powers(labels.by_operation[place][operation_powers(labels, dimension)])
    splits = [(a, n_electrons - a) for a in range(dimension + 1) if 0 <= n_electrons - a <= dimension]
    return {a - b: powers[a] * powers[b] for a, b in splits}


def _exterior_powers(power_sums: FloatArray) -> list[FloatArray]:
    """Characters of the exterior powers 0..n from those of g, g^2, .., g^n."""
    powers = [np.ones(power_sums.shape[1])]
    for k in range(1, len(power_sums) + 1):
        powers.append(sum((-1) ** (i - 1) * powers[k - i] * power_sums[i - 1] for i in range(1, k + 1)) / k)
    return powers


def _coupled(first: dict[int, FloatArray], second: dict[int, FloatArray]) -> dict[int, FloatArray]:
    """Characters of two sets of levels together."""
    total: dict[int, FloatArray] = {}
    for m_first, one in first.items():
        for m_second, other in second.items():
            total[m_first + m_second] = total.get(m_first + m_second, 0.0) + one * other
    return total


def dipole_polarisations(group: PointGroup | None, lower: str, upper: str) -> str:
    """Directions in which an electric-dipole transition is allowed by symmetry.

    Parameters
    ----------
    group : PointGroup or None
        None stands for C1.
    lower, upper : str
        Irreps of the two terms, in capitals.

    Returns
    -------
    polarisations : str
        Letters of the group's axes, such as ``xy``; empty if forbidden.

    Raises
    ------
    MultipletError
        If an irrep is unknown.

    Notes
    -----
    Allowed where the product of the two irreps holds one that the axis belongs to. Spin is judged apart.
    """
    labels = label_group(group)
    product = np.ones(len(labels.operations))
    for irrep in (lower, upper):
        if irrep not in labels.term_irreps:
            raise MultipletError(
                f"{labels.name} has no irrep {irrep!r}", mend=f"use one of {', '.join(labels.term_irreps)}"
            )
        product = product * labels.by_operation[labels.term_irreps.index(irrep)]
    present = labels.multiplicities(product) > 0
    # Diagonal elements of the projectors on the vectors x, y, z.
    axes = labels.projection_weights @ np.diagonal(labels.operations, axis1=1, axis2=2)
    return "".join(letter for letter, part in zip("xyz", axes[present].sum(axis=0), strict=True) if part > 1e-6)
