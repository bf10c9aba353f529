"""Parameter sets and atomic data of ehmo: reviewable tables, every row with its source."""

from basis_params.atomic_orbitals import AtomicOrbitalData, atomic_orbital
from basis_params.atoms import AtomData, atom, atom_symbols, ionisation_energy
from basis_params.catalogue import available_sets, load, load_set, read_table
from basis_params.faults import ParameterFileError
from basis_params.model import (
    ElementParameters,
    MissingElementError,
    ModelSettings,
    ParameterTable,
    Provenance,
    Shell,
)
from basis_params.writer import format_table

__all__ = [
    "AtomData",
    "AtomicOrbitalData",
    "ElementParameters",
    "MissingElementError",
    "ModelSettings",
    "ParameterFileError",
    "ParameterTable",
    "Provenance",
    "Shell",
    "atom",
    "atom_symbols",
    "atomic_orbital",
    "available_sets",
    "format_table",
    "ionisation_energy",
    "load",
    "load_set",
    "read_table",
]
