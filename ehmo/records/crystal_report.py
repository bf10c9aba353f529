"""The report on an extended structure: everything one periodic calculation says."""

from __future__ import annotations

from collections.abc import Iterator
from dataclasses import dataclass

import numpy as np

from ehmo.records.arrays import FloatArray, IntArray, frozen_floats, frozen_ints
from ehmo.records.bonding import BondOrders
from ehmo.records.crystal import MetalDonorUnit
from ehmo.records.crystal_electronic import CrystalBonding, EnergyCurve
from ehmo.records.fragment import hill_formula
from ehmo.records.markup import html_sentences, html_table
from ehmo.records.report import Method
from ehmo.records.wording import channel_weights


@dataclass(frozen=True, slots=True, eq=False)
class CrystalReport:
    """Result of one calculation on one crystal.

    Attributes
    ----------
    source, title : str
        File and block; title as found (hostile text: show it escaped).
    networks : tuple of str
        What the metals make, such as ``layer V2O5``.
    symbols : tuple of str
        Atoms of the cell that was calculated.
    positions_A : (n_atoms, 3) ndarray
        [angstrom]
    cell_A : (3, 3) ndarray
        Rows are the lattice vectors [angstrom].
    labels : tuple of str
        Label of each atom in the file (hostile text: show it escaped).
    sites : (n_atoms,) ndarray of int
        Equal for symmetry-equivalent atoms.
    cell_ratio : int
        Calculated cells in the cell of the file.
    method : Method
    bonding : CrystalBonding
    units : tuple of MetalDonorUnit
        One per bond of `bonding`; multiplicities are those of the cell of the file.
    density : EnergyCurve
        Density of states by shells.
    overlap_population : EnergyCurve
        Crystal-orbital overlap population by bonds.
    assumptions, warnings : tuple of str
        One sentence each.
    """

    source: str
    title: str
    networks: tuple[str, ...]
    symbols: tuple[str, ...]
    positions_A: FloatArray
    cell_A: FloatArray
    labels: tuple[str, ...]
    sites: IntArray
    cell_ratio: int
    method: Method
    bonding: CrystalBonding
    units: tuple[MetalDonorUnit, ...]
    density: EnergyCurve
    overlap_population: EnergyCurve
    assumptions: tuple[str, ...]
    warnings: tuple[str, ...]

    def __post_init__(self) -> None:
        n = len(self.symbols)
        put = object.__setattr__
        put(self, "positions_A", frozen_floats(self.positions_A, (n, 3), "positions_A"))
        put(self, "cell_A", frozen_floats(self.cell_A, (3, 3), "cell_A"))
        put(self, "sites", frozen_ints(self.sites, (n,), "sites"))

    @property
    def formula(self) -> str:
        """Hill formula of the calculated cell."""
        return hill_formula(self.symbols)

    def bonds(self) -> Iterator[tuple[MetalDonorUnit, BondOrders]]:
        """Each bond of the asymmetric unit with its orders."""
        return zip(self.units, self.bonding.orders, strict=True)

    def bonds_per_cell(self, unit: MetalDonorUnit) -> int:
        """Equivalent bonds in the calculated cell."""
        return unit.multiplicity // self.cell_ratio

    def metal_donor_overlap(self) -> FloatArray:
        """(n_k, n_bands) overlap population of each band with two electrons, over all metal-donor bonds [e]."""
        total = np.zeros(self.bonding.state.energies_eV.shape)
        for unit, order in self.bonds():
            total += self.bonds_per_cell(unit) * order.orbital_overlap.reshape(total.shape)
        return total

    def hybrid_composition(self, atom: int, hybrid: FloatArray) -> dict[str, float]:
        """Share of each shell of an atom of the cell in a hybrid."""
        basis = self.bonding.basis
        functions = basis.functions_of(self.bonding.place_of[atom])
        shells = basis.shell_of[functions]
        return {
            basis.shell_label(int(shell)): float((hybrid[shells == shell] ** 2).sum())
            for shell in dict.fromkeys(shells)
        }

    def _repr_html_(self) -> str:
        """Bonds of the asymmetric unit as a table for a notebook, with what was assumed and what is doubtful."""
        gap = self.bonding.gap
        kind = "metal" if gap is None else f"gap {gap.gap_eV:.2f} eV, {'direct' if gap.is_direct else 'indirect'}"
        caption = f"{', '.join(self.networks) or self.formula}: {kind}, set {self.method.parameter_set}"
        rows = [["bond", "kind", "n", "length/Å", "overlap pop.", "Mayer", "Wiberg", "channels and their weights"]]
        for unit, orders in self.bonds():
            rows.append(
                [
                    f"{unit.metal}-{unit.donor}",
                    unit.kind,
                    str(unit.per_metal),
                    f"{unit.length_A:.3f}",
                    *(f"{value:z.2f}" for value in (orders.overlap_population, orders.mayer, orders.wiberg)),
                    channel_weights(orders.channels),
                ]
            )
        parts = [html_table(caption, rows, range(2, 7)), html_sentences("To doubt", self.warnings, shown=True)]
        return "".join([*parts, html_sentences("Assumed", self.assumptions)])
