"""Pairs of atoms, grouped so that every group is evaluated at once."""

from __future__ import annotations

from collections.abc import Callable, Sequence
from dataclasses import dataclass
from functools import lru_cache

import numpy as np

from basis_params import ParameterTable
from ehmo.orbitals.blocks import BlockStructure, block_structure
from ehmo.orbitals.parameters import element_parameters
from ehmo.orbitals.tables import OverlapTable, overlap_table
from ehmo.records.arrays import FloatArray, IntArray
from ehmo.records.basis import Basis


@dataclass(frozen=True, slots=True, eq=False)
class PairGroup:
    """Pairs whose atoms have the same shell layouts.

    Attributes
    ----------
    pairs : slice
        Range within the pair arrays of the plan.
    structure : BlockStructure
        Angular part.
    kind : (n_pairs,) ndarray of int
        Which element pair each pair is.
    coefficients : (n_kinds, n_segments, degree + 1, n_channels) ndarray
        Overlap tables of those element pairs, padded with zeros to one length.
    """

    pairs: slice
    structure: BlockStructure
    kind: IntArray
    coefficients: FloatArray


@dataclass(frozen=True, slots=True, eq=False)
class OrbitalPlan:
    """All that follows from elements and parameters alone; positions come later.

    Attributes
    ----------
    basis : Basis
        Functions of the atoms.
    first, second : (n_pairs,) ndarray of int
        Atoms of each pair, every pair of different atoms once.
    groups : tuple of PairGroup
        Consecutive ranges of the pairs.
    """

    basis: Basis
    first: IntArray
    second: IntArray
    groups: tuple[PairGroup, ...]


@lru_cache(maxsize=16)
def orbital_plan(symbols: tuple[str, ...], table: ParameterTable) -> OrbitalPlan:
    """Basis and pair groups of a molecule.

    Parameters
    ----------
    symbols : tuple of str
        Chemical symbols.
    table : ParameterTable
        Parameter set.

    Returns
    -------
    plan : OrbitalPlan

    Raises
    ------
    ParameterError
        If the set lacks an element.
    """
    basis = build_basis(symbols, table)
    shells = {symbol: table.element(symbol).shells for symbol in set(symbols)}
    layouts = {symbol: tuple(shell.l for shell in shells[symbol]) for symbol in shells}
    members: dict[tuple[int, ...], list[int]] = {}
    for atom, symbol in enumerate(symbols):
        members.setdefault(layouts[symbol], []).append(atom)
    firsts: list[IntArray] = []
    seconds: list[IntArray] = []
    groups: list[PairGroup] = []
    start = 0
    ordered = sorted(members)
    for i, layout_a in enumerate(ordered):
        for layout_b in ordered[i:]:
            first, second = _pairs_between(members[layout_a], members[layout_b], layout_a == layout_b)
            if not len(first):
                continue
            firsts.append(first)
            seconds.append(second)
            kind, coefficients = stacked_tables(
                symbols, first, second, lambda a, b: overlap_table(shells[a], shells[b])
            )
            groups.append(
                PairGroup(slice(start, start + len(first)), block_structure(layout_a, layout_b), kind, coefficients)
            )
            start += len(first)
    empty = [np.zeros(0, dtype=np.intp)]
    return OrbitalPlan(basis, np.concatenate(firsts or empty), np.concatenate(seconds or empty), tuple(groups))


def build_basis(symbols: tuple[str, ...], table: ParameterTable) -> Basis:
    """Valence functions of the atoms; see `orbital_plan`."""
    types: dict[tuple[str, int], int] = {}
    energies: list[float] = []
    rows: list[tuple[int, int, int, int]] = []
    core_charges: list[float] = []
    for atom, symbol in enumerate(symbols):
        element = element_parameters(table, symbol)
        core_charges.append(float(element.valence_electrons))
        for index, shell in enumerate(element.shells):
            kind = types.setdefault((symbol, index), len(types))
            if kind == len(energies):
                energies.append(shell.h_ii_eV)
            rows.append((atom, shell.n, shell.l, kind))
    shell_atom, shell_n, shell_l, shell_type = np.array(rows, dtype=np.intp).T
    return Basis(symbols, np.array(core_charges), shell_atom, shell_n, shell_l, shell_type, np.array(energies))


def _pairs_between(first: list[int], second: list[int], same: bool) -> tuple[IntArray, IntArray]:
    """Every pair of one atom of each list, once."""
    a, b = np.array(first, dtype=np.intp), np.array(second, dtype=np.intp)
    if same:
        upper = np.triu_indices(len(a), 1)
        return a[upper[0]], a[upper[1]]
    return np.repeat(a, len(b)), np.tile(b, len(a))


def stacked_tables(
    symbols: Sequence[str], first: IntArray, second: IntArray, table_of: Callable[[str, str], OverlapTable]
) -> tuple[IntArray, FloatArray]:
    """Element-pair index of each pair, and the tables of those element pairs in one array."""
    names = sorted(set(symbols))
    code = np.array([names.index(symbol) for symbol in symbols], dtype=np.intp)
    pair_code = code[first] * len(names) + code[second]
    present, kind = np.unique(pair_code, return_inverse=True)
    tables = [table_of(names[value // len(names)], names[value % len(names)]).coefficients for value in present]
    n_segments = max(len(table) for table in tables)
    stacked = np.zeros((len(tables), n_segments, *tables[0].shape[1:]))
    for index, table in enumerate(tables):
        stacked[index, : len(table)] = table
    return kind.astype(np.intp), stacked
