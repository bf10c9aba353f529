"""A report set beside a minimal-basis run of the same fragment: numbers of both sides and verdicts."""

from __future__ import annotations

from dataclasses import dataclass
from typing import Literal

from ehmo.records.arrays import FloatArray, frozen_floats
from ehmo.records.basis import Basis
from ehmo.records.bonding import BondChannel
from ehmo.records.coordination import MetalDonorBond
from ehmo.records.markup import html_sentences, html_table
from ehmo.records.report import BondReport

Theory = Literal["pbe", "b3lyp", "hf"]
"""Level of the minimal-basis run: a functional, or restricted (open-shell) Hartree-Fock."""

VerdictKind = Literal["agrees", "higher", "lower", "doubtful"]


@dataclass(frozen=True, slots=True, eq=False)
class ReferenceRun:
    """Converged minimal-basis run; there is no record of one that did not converge.

    Attributes
    ----------
    theory : {"pbe", "b3lyp", "hf"}
    program : str
        Such as ``PySCF 2.14.0``.
    recipe : str
        Name and version of the recipe.
    key : str
        SHA-256 of the input, under which the run is cached.
    from_cache : bool
    energy_hartree : float
        Total energy [hartree].
    spin_squared : float
        Expectation value of the squared spin.
    tried : tuple of str
        Steps of convergence, in order.
    doubts : tuple of str
        What to doubt in the run, one sentence each.
    basis : Basis
        All functions, inner shells included; its core charges are the nuclear charges, its h_ii NaN.
    overlap : (n_ao, n_ao) ndarray
    densities : (2, n_ao, n_ao) ndarray
        Alpha and beta density.
    energies_eV : (n_mo,) ndarray
        Eigenvalues of the mean of alpha and beta Fock matrix; for a closed shell the orbital energies [eV].
    coefficients : (n_ao, n_mo) ndarray
        Its eigenvectors.
    occupations : (2, n_mo) ndarray
        Alpha and beta electrons in each of them.
    """

    theory: Theory
    program: str
    recipe: str
    key: str
    from_cache: bool
    energy_hartree: float
    spin_squared: float
    tried: tuple[str, ...]
    doubts: tuple[str, ...]
    basis: Basis
    overlap: FloatArray
    densities: FloatArray
    energies_eV: FloatArray
    coefficients: FloatArray
    occupations: FloatArray

    def __post_init__(self) -> None:
        n = len(self.basis)
        shapes: dict[str, tuple[int | None, ...]] = {
            "overlap": (n, n),
            "densities": (2, n, n),
            "energies_eV": (n,),
            "coefficients": (n, n),
            "occupations": (2, n),
        }
        for name, shape in shapes.items():
            object.__setattr__(self, name, frozen_floats(getattr(self, name), shape, name))


@dataclass(frozen=True, slots=True)
class AtomNumbers:
    """Mulliken charge and unpaired electrons of one atom [e]."""

    charge: float
    spin: float


@dataclass(frozen=True, slots=True, eq=False)
class BondNumbers:
    """One side's numbers of one bond.

    Attributes
    ----------
    overlap_population : float
        Between the metal's valence shells and the donor [e].
    mayer, wiberg : float
    channels : tuple of BondChannel
        By falling weight.
    """

    overlap_population: float
    mayer: float
    wiberg: float
    channels: tuple[BondChannel, ...]


@dataclass(frozen=True, slots=True)
class FrontierLevel:
    """One orbital, or one degenerate set, near the frontier.

    Attributes
    ----------
    irrep : str
        In the group of the idealised sphere; empty where there is none.
    irrep_share : float
    degeneracy : int
        Orbitals in the set.
    energy_eV : float
        Above the highest orbital that holds electrons [eV].
    electrons : float
        In the whole set.
    shell_share : float
        Part on the metal's d (f) shell, mean of the set.
    """

    irrep: str
    irrep_share: float
    degeneracy: int
    energy_eV: float
    electrons: float
    shell_share: float


@dataclass(frozen=True, slots=True)
class LadderStep:
    """One level of a ladder.

    Attributes
    ----------
    label : str
        Irrep, or the leading function where there is none.
    above_lowest_eV : float
        [eV]
    electrons : float
    shell_share : float
        Part on the metal's d (f) shell.
    """

    label: str
    above_lowest_eV: float
    electrons: float
    shell_share: float


@dataclass(frozen=True, slots=True)
class Verdict:
    """What the comparison says of one bond.

    Attributes
    ----------
    kind : {"agrees", "higher", "lower", "doubtful"}
    mayer_difference : float
        Mayer order of the report minus that of the run.
    words : str
        The verdict in a few words.
    reasons : tuple of str
        One sentence each.
    """

    kind: VerdictKind
    mayer_difference: float
    words: str
    reasons: tuple[str, ...]


@dataclass(frozen=True, slots=True, eq=False)
class BondComparison:
    """Both sides of one bond."""

    bond: MetalDonorBond
    ours: BondNumbers
    reference: BondNumbers
    verdict: Verdict


@dataclass(frozen=True, slots=True)
class LadderComparison:
    """Both ladders of one metal, lowest level first.

    Attributes
    ----------
    metal : int
        Atom index.
    shell : str
        Such as ``3d``; empty if neither side has a ladder.
    ours, reference : tuple of LadderStep
        Empty where withheld.
    withheld : tuple of str
        Why a ladder is missing, one sentence each.
    swapped : tuple of (str, str)
        Pairs of levels, lower first in the report, that both sides order clearly and oppositely.
    """

    metal: int
    shell: str
    ours: tuple[LadderStep, ...]
    reference: tuple[LadderStep, ...]
    withheld: tuple[str, ...]
    swapped: tuple[tuple[str, str], ...]


@dataclass(frozen=True, slots=True)
class FrontierComparison:
    """Orbitals of both sides round the frontier, lowest first.

    Attributes
    ----------
    ours, reference : tuple of FrontierLevel
    same_highest_filled, same_lowest_empty : bool or None
        Whether that set has the same irrep, near-degenerate ones allowed for; None without irreps.
    """

    ours: tuple[FrontierLevel, ...]
    reference: tuple[FrontierLevel, ...]
    same_highest_filled: bool | None
    same_lowest_empty: bool | None


@dataclass(frozen=True, slots=True, eq=False)
class Crosscheck:
    """A bond report beside a minimal-basis run.

    Attributes
    ----------
    report : BondReport
    run : ReferenceRun
    atoms : tuple of (AtomNumbers, AtomNumbers)
        Report and run, for each atom.
    bonds : tuple of BondComparison
        In the order of the report's bonds.
    ladders : tuple of LadderComparison
        One per metal.
    frontier : FrontierComparison
    """

    report: BondReport
    run: ReferenceRun
    atoms: tuple[tuple[AtomNumbers, AtomNumbers], ...]
    bonds: tuple[BondComparison, ...]
    ladders: tuple[LadderComparison, ...]
    frontier: FrontierComparison

    def _repr_html_(self) -> str:
        """Both sides of each bond as a table for a notebook."""
        labels = self.report.fragment.labels
        rows = [["bond", "kind", "Mayer", "of the run", "overlap pop.", "of the run", "verdict"]]
        for one in self.bonds:
            ours, other = one.ours, one.reference
            numbers = (ours.mayer, other.mayer, ours.overlap_population, other.overlap_population)
            name = f"{labels[one.bond.metal]}-{labels[one.bond.donor]}"
            rows.append([name, one.bond.kind, *(f"{value:z.2f}" for value in numbers), one.verdict.words])
        caption = f"{self.report.fragment.formula} beside {self.run.theory} in a minimal basis ({self.run.program})"
        return html_table(caption, rows, (2, 3, 4, 5)) + html_sentences("To doubt in the run", self.run.doubts)
