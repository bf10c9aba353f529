"""What the bond graph of a fragment says: metals, bonds, ligands, donor kinds, local frames."""

from __future__ import annotations

from dataclasses import dataclass
from enum import StrEnum

from ehmo.records.arrays import FloatArray, frozen_floats


class DonorKind(StrEnum):
    """Kind of a donor atom, by what else it is bonded to; the value is what people read."""

    OXO = "oxo"
    HYDROXO = "hydroxo"
    AQUA = "aqua"
    HYDROXO_DOUBTFUL = "hydroxo?"
    AQUA_DOUBTFUL = "aqua?"
    ALKOXO = "alkoxo"
    ETHER = "ether or carbonyl O"
    BRIDGING_OXO = "bridging oxo"
    PEROXO_END_ON = "peroxo (end-on)"
    PEROXO_SIDE_ON = "peroxo (side-on)"
    SUPEROXO = "superoxo"
    CARBOXYLATO = "carboxylato"
    OXOANION = "oxoanion"
    NITRIDO = "nitrido"
    BRIDGING_NITRIDO = "bridging nitrido"
    IMIDO_LINEAR = "imido (linear)"
    IMIDO_BENT = "imido (bent)"
    NITROSYL_LINEAR = "nitrosyl (linear)"
    NITROSYL_BENT = "nitrosyl (bent)"
    AMIDO = "amido"
    AMINE = "ammine or amine"
    NITRILE = "nitrile"
    NITROGEN = "other N"
    CARBONYL = "carbonyl"
    CARBENE = "carbene"
    CARBYNE = "carbyne"
    ALKYL = "alkyl or aryl"
    SIDE_ON_CARBON = "side-on carbon"
    CYANIDO = "cyanido"
    HYDRIDO = "hydrido"
    PHOSPHINE = "phosphine"
    SULFIDO = "sulfido"
    BRIDGING_SULFIDO = "bridging sulfido"
    THIOLATO = "thiolato"
    HALIDE = "halide"
    OTHER = "other"


MULTIPLY_BONDED_KINDS = frozenset(
    {
        DonorKind.OXO,
        DonorKind.NITRIDO,
        DonorKind.IMIDO_LINEAR,
        DonorKind.IMIDO_BENT,
        DonorKind.CARBENE,
        DonorKind.CARBYNE,
        DonorKind.SULFIDO,
    }
)
"""Kinds whose bond to the metal may be multiple by textbook counting."""


@dataclass(frozen=True, slots=True)
class MetalDonorBond:
    """One metal-donor contact that counts as a bond.

    Attributes
    ----------
    metal, donor : int
        Atom indices, from 0.
    kind : DonorKind
        Kind of the donor atom.
    length_A : float
        Distance [angstrom].
    bond_valence : float or None
        exp((R0 - R)/B), None where no R0 is tabulated for the pair [valence units].
    ligand : int
        Index of the ligand the donor belongs to.
    """

    metal: int
    donor: int
    kind: DonorKind
    length_A: float
    bond_valence: float | None
    ligand: int

    @property
    def may_be_multiple(self) -> bool:
        """Whether textbook counting lets this bond be multiple."""
        return self.kind in MULTIPLY_BONDED_KINDS


@dataclass(frozen=True, slots=True)
class Ligand:
    """A connected piece of the bond graph once the metals are taken out.

    Attributes
    ----------
    atoms : tuple of int
        Atom indices, ascending.
    donors : tuple of int
        Those bonded to a metal, ascending.
    metals : tuple of int
        Metals they are bonded to, ascending; none for a counter-ion or solvent.
    formula : str
        Hill formula.
    charge : int or None
        Formal (closed-shell) charge; None where it cannot be told from the graph.
    charge_reason : str
        Why that charge, in a few words.
    """

    atoms: tuple[int, ...]
    donors: tuple[int, ...]
    metals: tuple[int, ...]
    formula: str
    charge: int | None
    charge_reason: str


@dataclass(frozen=True, slots=True, eq=False)
class LocalFrame:
    """Right-handed axes of one metal.

    Attributes
    ----------
    metal : int
        Atom index.
    axes : (3, 3) ndarray
        Rows are the unit vectors x, y, z.
    z_reason, x_reason : str
        What fixed them, in words.
    """

    metal: int
    axes: FloatArray
    z_reason: str
    x_reason: str

    def __post_init__(self) -> None:
        object.__setattr__(self, "axes", frozen_floats(self.axes, (3, 3), "axes"))


@dataclass(frozen=True, slots=True, eq=False)
class Coordination:
    """Metals, bonds, ligands and local frames of a fragment.

    Attributes
    ----------
    metals : tuple of int
        Atom indices of the metals, ascending.
    bonds : tuple of MetalDonorBond
        Sorted by metal, then length.
    ligands : tuple of Ligand
        Sorted by first atom.
    frames : tuple of LocalFrame
        One per metal, in the order of `metals`.
    warnings : tuple of str
        What to doubt, one sentence each.
    """

    metals: tuple[int, ...]
    bonds: tuple[MetalDonorBond, ...]
    ligands: tuple[Ligand, ...]
    frames: tuple[LocalFrame, ...]
    warnings: tuple[str, ...] = ()

    def bonds_of(self, metal: int) -> tuple[MetalDonorBond, ...]:
        """Bonds of one metal, shortest first."""
        return tuple(bond for bond in self.bonds if bond.metal == metal)


@dataclass(frozen=True, slots=True)
class ElectronAssignment:
    """Charge and unpaired electrons of a fragment with the reasoning behind them.

    Attributes
    ----------
    charge, unpaired_electrons : int
        Values used.
    charge_reason, unpaired_reason : str
        "given" or the guess in words.
    metal_oxidation_total : int or None
        Sum of the metals' oxidation states by counting; None where a ligand charge is unknown.
    d_electrons : int or None
        Valence d (or f) electrons of a single metal by counting; None where it cannot be counted.
    spin_candidates : tuple of int
        Numbers of unpaired electrons that counting leaves open, the ladder to decide; empty if it is settled.
    spin_doubt : str
        Why the spin may be another one; empty if it is clear.
    """

    charge: int
    unpaired_electrons: int
    charge_reason: str
    unpaired_reason: str
    metal_oxidation_total: int | None
    d_electrons: int | None
    spin_candidates: tuple[int, ...] = ()
    spin_doubt: str = ""
