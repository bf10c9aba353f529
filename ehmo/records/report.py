"""The bond report: everything one calculation says."""

from __future__ import annotations

from collections.abc import Iterator
from dataclasses import dataclass

import numpy as np

from ehmo.conventions import atom_label
from ehmo.errors import visible
from ehmo.records.arrays import FloatArray
from ehmo.records.basis import Basis
from ehmo.records.bonding import BondOrders, Populations
from ehmo.records.coordination import Coordination, ElectronAssignment, MetalDonorBond
from ehmo.records.electronic import ElectronicState
from ehmo.records.formal_order import FormalOrder
from ehmo.records.fragment import Fragment
from ehmo.records.health import Health
from ehmo.records.markup import html_sentences, html_table
from ehmo.records.reactivity import DonorReactivity
from ehmo.records.site import MetalSite, Spectroscopy
from ehmo.records.spread import LevelSpread, Spread
from ehmo.records.symmetry import OrbitalIrreps, Symmetry
from ehmo.records.table import aligned
from ehmo.records.wording import BOND_NUMBERS, bond_rows, electrons_in_words


@dataclass(frozen=True, slots=True)
class Method:
    """How the numbers were made.

    Attributes
    ----------
    parameter_set, edition, parameter_sha256 : str
        Name, edition and content hash of the parameter set.
    parameter_origin : str
        "built in" or the file.
    charge_model : str
        "fixed" or "self-consistent".
    K, K_sigma, K_pi, K_delta : float
        Wolfsberg-Helmholz constants used.
    weighting : bool
        Whether K was weighted.
    K_decay_per_A : float
        Decay of K with distance [1/angstrom].
    lambda_ : float
        Weight of the charge potential; without effect if charges are fixed.
    iterations : int
        Diagonalisations.
    charge_residual : float
        Largest last change of a charge [e].
    smearing_eV : float
        Width of the Fermi-Dirac filling, 0 for whole electrons [eV].
    smallest_overlap_eigenvalue : float
        Near zero means nearly dependent functions.
    """

    parameter_set: str
    edition: str
    parameter_sha256: str
    parameter_origin: str
    charge_model: str
    K: float
    K_sigma: float
    K_pi: float
    K_delta: float
    weighting: bool
    K_decay_per_A: float
    lambda_: float
    iterations: int
    charge_residual: float
    smearing_eV: float
    smallest_overlap_eigenvalue: float


@dataclass(frozen=True, slots=True, eq=False)
class BondReport:
    """Result of one calculation on one fragment.

    Attributes
    ----------
    fragment : Fragment
        Atoms, with the charge and unpaired electrons used.
    coordination : Coordination
        Metals, bonds, ligands, local frames.
    electrons : ElectronAssignment
        Charge and spin with their reasons.
    method : Method
        Parameters and convergence.
    basis : Basis
        Functions.
    overlap : (n_ao, n_ao) ndarray
        Overlap matrix.
    state : ElectronicState
        Orbitals, filling and charges.
    populations : Populations
        Mulliken populations.
    orders : tuple of BondOrders
        One per bond, in the order of `coordination.bonds`.
    molecule_symmetry : Symmetry or None
        Of all atoms; None if they are too many to search.
    sites : tuple of MetalSite
        Symmetry, oxidation state and ladder of each metal.
    irreps : OrbitalIrreps or None
        Labels of the orbitals in the group of the idealised sphere; None for several metals.
    molecule_irreps : OrbitalIrreps or None
        For several metals the labels in the group of the whole molecule; None where that is C1 or not known.
    formal_orders : tuple of FormalOrder or None
        Textbook order of each bond, None where no ladder tells it.
    reactivity : tuple of DonorReactivity
        Reading of each multiply bonded donor.
    spectroscopy : Spectroscopy
        Terms, bands and magnetism.
    health : Health
        Whether the numbers can mean what they should.
    assumptions : tuple of str
        What was taken for granted, one sentence each.
    warnings : tuple of str
        What to doubt, one sentence each.
    spread : Spread or None
        Standard deviations over draws of the parameters, if they were asked for.
    """

    fragment: Fragment
    coordination: Coordination
    electrons: ElectronAssignment
    method: Method
    basis: Basis
    overlap: FloatArray
    state: ElectronicState
    populations: Populations
    orders: tuple[BondOrders, ...]
    molecule_symmetry: Symmetry | None
    sites: tuple[MetalSite, ...]
    irreps: OrbitalIrreps | None
    formal_orders: tuple[FormalOrder | None, ...]
    reactivity: tuple[DonorReactivity, ...]
    spectroscopy: Spectroscopy
    health: Health
    assumptions: tuple[str, ...]
    warnings: tuple[str, ...]
    spread: Spread | None = None
    molecule_irreps: OrbitalIrreps | None = None

    @property
    def orbital_irreps(self) -> OrbitalIrreps | None:
        """Labels of the orbitals in the group of the sphere or, with several metals, of the whole molecule."""
        return self.molecule_irreps if self.irreps is None else self.irreps

    def bonds(self) -> Iterator[tuple[MetalDonorBond, BondOrders]]:
        """Each metal-donor bond with its orders."""
        return zip(self.coordination.bonds, self.orders, strict=True)

    def distinct_bonds(self) -> list[int]:
        """Places of the bonds that crystal symmetry does not make of an earlier one; all of them without a crystal."""
        crystal = self.fragment.crystal
        return [
            place
            for place, bond in enumerate(self.coordination.bonds)
            if crystal is None or crystal.is_first(bond.metal, bond.donor)
        ]

    def distinct_sites(self) -> list[MetalSite]:
        """Metals that crystal symmetry does not make of an earlier one."""
        crystal = self.fragment.crystal
        return [site for site in self.sites if crystal is None or crystal.first_equivalent(site.metal) == site.metal]

    def bond_label(self, bond: MetalDonorBond) -> str:
        """Label such as ``V1-O2``."""
        symbols = self.fragment.symbols
        return f"{atom_label(symbols[bond.metal], bond.metal)}-{atom_label(symbols[bond.donor], bond.donor)}"

    def orbital_overlap(self) -> FloatArray:
        """(n_mo,) metal-donor overlap population of each orbital holding two electrons [e]."""
        total: FloatArray = np.sum([orders.orbital_overlap for orders in self.orders], axis=0)
        return total

    def hybrid_composition(self, atom: int, hybrid: FloatArray) -> dict[str, float]:
        """Share of each shell of an atom in a hybrid, such as ``{"3d": 0.93, "4p": 0.07}``."""
        functions = self.basis.functions_of(atom)
        shells = self.basis.shell_of[functions]
        # Functions of a shell stand together.
        starts = np.flatnonzero(np.diff(shells, prepend=-1))
        shares: list[float] = np.add.reduceat(hybrid * hybrid, starts).tolist()
        return dict(zip(map(self.basis.shell_label, shells[starts].tolist()), shares, strict=True))

    def site_of(self, metal: int) -> MetalSite:
        """Site of one metal."""
        return next(site for site in self.sites if site.metal == metal)

    def level_spreads(self, site: MetalSite) -> tuple[LevelSpread, ...]:
        """Standard deviations of the levels of a metal's ladder; empty where there are none."""
        return () if self.spread is None else self.spread.levels[self.sites.index(site)]

    def __str__(self) -> str:
        return "\n".join([self._heading(), *aligned(self._rows(), numeric=BOND_NUMBERS)])

    __repr__ = __str__

    def _repr_html_(self) -> str:
        """Bonds and levels as tables for a notebook, with what was assumed and what is doubtful."""
        parts = [html_table(self._heading(), self._rows(), BOND_NUMBERS)]
        parts += [html_table(*_levels(self, site), (1, 2, 3, 4)) for site in self.sites if site.ladder is not None]
        parts += [html_sentences("To doubt", self.warnings, shown=True), html_sentences("Assumed", self.assumptions)]
        return "".join(parts)

    def _heading(self) -> str:
        fragment, method = self.fragment, self.method
        model = f"set {visible(method.parameter_set)}, {method.charge_model} charges"
        return f"{fragment.formula}, {electrons_in_words(fragment)}, {model}"

    def _rows(self) -> list[list[str]]:
        spreads = None if self.spread is None else self.spread.bonds
        return bond_rows(self.coordination.bonds, self.orders, self.formal_orders, self.fragment.labels, spreads)


def _levels(report: BondReport, site: MetalSite) -> tuple[str, list[list[str]]]:
    """Caption, heading and rows of the ladder of a metal, topmost level first."""
    levels = () if site.ladder is None else site.ladder.levels
    rows = [["level", "above lowest/eV", "electrons", "metal/%", "donors/%"]]
    for level in reversed(levels):
        irrep = level.irrep
        if report.irreps is not None and level.orbital is not None:
            irrep = report.irreps.labels[level.orbital]
        rows.append(
            [
                f"{irrep} {level.function}".strip(),
                f"{level.energy_eV - levels[0].energy_eV:.2f}",
                f"{round(level.electrons, 2):g}",
                f"{100 * level.metal_share:.0f}",
                f"{100 * level.donor_share:.0f}",
            ]
        )
    shell = "" if site.ladder is None else site.ladder.shell
    ground = f", ground term {report.spectroscopy.ground_term}" if report.spectroscopy.ground_term else ""
    return f"{report.fragment.labels[site.metal]} {shell} levels{ground}", rows
