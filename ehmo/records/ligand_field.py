"""The ladder of d-like (or f-like) levels of a metal and what ligand-field theory reads from it."""

from __future__ import annotations

from dataclasses import dataclass

from ehmo.records.arrays import FloatArray, frozen_floats


@dataclass(frozen=True, slots=True)
class LadderLevel:
    """One d-like (or f-like) level.

    Attributes
    ----------
    function : str
        Leading function in the metal's local axes, such as ``dxy``.
    function_share : float
        Part of that function in the level's d (f) character.
    energy_eV : float
        Eigenvalue of the effective matrix [eV].
    orbital : int or None
        Molecular orbital that it is; None where several metals share the orbitals.
    electrons : float
        Electrons in it.
    metal_share, donor_share : float
        Parts of the orbital on the metal's shell and on the donors (orthonormalised functions).
    overlap_population : float
        Between metal and donors, for two electrons [e].
    inverted : bool
        Whether its bonding partner has more of the metal's shell.
    partner_share : float
        Largest part of the metal's shell in a bonding partner.
    irrep : str
        Irrep of the level's functions at the metal in the group of its idealised sphere; empty if not asked for.
    irrep_share : float
        Its part of them.
    """

    function: str
    function_share: float
    energy_eV: float
    orbital: int | None
    electrons: float
    metal_share: float
    donor_share: float
    overlap_population: float
    inverted: bool
    partner_share: float
    irrep: str = ""
    irrep_share: float = 1.0


@dataclass(frozen=True, slots=True, eq=False)
class Ladder:
    """Effective ligand field of one metal.

    Attributes
    ----------
    metal : int
        Atom index.
    shell : str
        Such as ``3d``.
    levels : tuple of LadderLevel
        By rising energy.
    field_eV : (2l+1, 2l+1) ndarray
        Effective matrix in the local axes, functions in the order m = -l..l [eV].
    vectors : (2l+1, 2l+1) ndarray
        Column k is level k in the local functions.
    reference_eV : float
        Diagonal element of the shell in the calculation's own Hamiltonian [eV].
    selection : str
        How the orbitals were chosen, in words.
    orbitals : tuple of int
        Molecular orbitals behind the effective matrix, with several metals those of all.
    """

    metal: int
    shell: str
    levels: tuple[LadderLevel, ...]
    field_eV: FloatArray
    vectors: FloatArray
    reference_eV: float
    selection: str
    orbitals: tuple[int, ...] = ()

    def __post_init__(self) -> None:
        n = len(self.levels)
        object.__setattr__(self, "field_eV", frozen_floats(self.field_eV, (n, n), "field_eV"))
        object.__setattr__(self, "vectors", frozen_floats(self.vectors, (n, n), "vectors"))

    @property
    def angular_momentum(self) -> int:
        """Quantum number l of the shell."""
        return (len(self.levels) - 1) // 2


@dataclass(frozen=True, slots=True)
class AngularOverlap:
    """One angular-overlap parameter of one kind of ligand.

    Attributes
    ----------
    kind : str
        Kind of the donors.
    symmetry : str
        "sigma" or "pi".
    value_eV : float or None
        e_sigma or e_pi; None where the geometry does not determine it [eV].
    """

    kind: str
    symmetry: str
    value_eV: float | None


@dataclass(frozen=True, slots=True)
class LigandFieldParameters:
    """Parameters of ligand-field models that reproduce a ladder.

    Attributes
    ----------
    crystal_field_per_cm : dict of str to float
        ``10Dq``, ``Dq``, ``Ds``, ``Dt`` where the symmetry defines them [cm^-1].
    angular_overlap : tuple of AngularOverlap
    undetermined : tuple of str
        Combinations that the geometry leaves open, in words.
    rms_per_cm : float
        Root mean square misfit of the angular-overlap levels [cm^-1].
    """

    crystal_field_per_cm: dict[str, float]
    angular_overlap: tuple[AngularOverlap, ...]
    undetermined: tuple[str, ...]
    rms_per_cm: float


@dataclass(frozen=True, slots=True)
class SpinChoice:
    """Spin state by the ladder against the pairing energy.

    Attributes
    ----------
    unpaired_electrons : int
    reason : str
        The comparison in words.
    margin_per_cm : float
        Energy of the next spin state above [cm^-1].
    """

    unpaired_electrons: int
    reason: str
    margin_per_cm: float
