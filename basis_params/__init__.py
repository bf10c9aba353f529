"""Parameter sets and atomic data of ehmo: reviewable tables, every row with its source."""

from basis_params.atomic_orbitals import AtomicOrbitalData, atomic_orbital
from basis_params.atoms import AtomData, atom, atom_symbols, ionisation_energy
from basis_params.audits import AuditReport, AuditRow, audit
from basis_params.bibliography import Reference, references
from basis_params.bond_valence import BondValence, bond_valence_R0
from basis_params.catalogue import available_sets, load, load_set, read_table
from basis_params.faults import ParameterFileError
from basis_params.ligand_field import (
    PairingEnergy,
    RacahParameters,
    SlaterIntegrals,
    SpinOrbitConstant,
    pairing_energy,
    racah,
    slater_integrals,
    spin_orbit,
)
from basis_params.masses import atomic_mass
from basis_params.model import (
    ElementParameters,
    MissingElementError,
    ModelSettings,
    PairRepulsion,
    ParameterTable,
    Provenance,
    Shell,
)
from basis_params.writer import format_table

__all__ = [
    "AtomData",
    "AtomicOrbitalData",
    "AuditReport",
    "AuditRow",
    "BondValence",
    "ElementParameters",
    "MissingElementError",
    "ModelSettings",
    "PairRepulsion",
    "PairingEnergy",
    "ParameterFileError",
    "ParameterTable",
    "Provenance",
    "RacahParameters",
    "Reference",
    "Shell",
    "SlaterIntegrals",
    "SpinOrbitConstant",
    "atom",
    "atom_symbols",
    "atomic_mass",
    "atomic_orbital",
    "audit",
    "available_sets",
    "bond_valence_R0",
    "format_table",
    "ionisation_energy",
    "load",
    "load_set",
    "pairing_energy",
    "racah",
    "read_table",
    "references",
    "slater_integrals",
    "spin_orbit",
]
