"""The energy of a parameter set as a calculator of ASE, for its optimisers, vibrations and constraints."""

from __future__ import annotations

from collections.abc import Sequence
from typing import TYPE_CHECKING, Any

import numpy as np
from ase.calculators.calculator import Calculator as AseCalculator
from ase.calculators.calculator import all_changes

import basis_params
from ehmo.calculate.energy import energy_model
from ehmo.errors import InputError
from ehmo.orbitals.parameters import load_parameters
from ehmo.records.fragment import Fragment
from ehmo.records.options import Options

if TYPE_CHECKING:
    from ase import Atoms

    from basis_params import ParameterTable


class Calculator(AseCalculator):
    """Calculator of one molecule or ion with fixed charge and spin.

    ``energy`` and ``free_energy`` are relative to the separated neutral atoms; ``forces`` belong to ``free_energy``,
    which differs from ``energy`` where a filling had to be smeared. ``charges`` are Mulliken charges; ``dipole`` is
    about the origin of the coordinates, which matters for an ion.

    Parameters
    ----------
    params : str or ParameterTable
        Name of a shipped set, path of a table, or a loaded table. Bond lengths and vibrations mean something only
        where the set is calibrated for the pairs of bonded atoms.
    charge : int
        Total charge.
    unpaired_electrons : int or None
        Unpaired electrons; None for 0 or 1, whichever fits the number of electrons.
    options : Options, optional
        Charge model and constants that override the set.

    Raises
    ------
    EhmoError
        If the set cannot be read; later if the atoms are periodic, lie too close, lack parameters, or if the charges
        do not converge.

    Examples
    --------
    >>> from ase import Atoms
    >>> water = Atoms("OH2", [[0, 0, 0], [0.76, 0.59, 0], [-0.76, 0.59, 0]])
    >>> water.calc = Calculator()
    >>> water.get_forces().shape
    (3, 3)
    """

    implemented_properties = [  # noqa: RUF012  # ASE's own way of naming them
        "energy",
        "free_energy",
        "forces",
        "charges",
        "dipole",
    ]

    def __init__(
        self,
        params: str | ParameterTable = "standard",
        *,
        charge: int = 0,
        unpaired_electrons: int | None = None,
        options: Options | None = None,
    ) -> None:
        super().__init__()  # type: ignore[no-untyped-call]
        table = params if isinstance(params, basis_params.ParameterTable) else load_parameters(params)
        self.model = energy_model(table, options)
        self.charge = charge
        self.unpaired_electrons = unpaired_electrons

    def calculate(
        self,
        atoms: Atoms | None = None,
        properties: Sequence[str] = ("energy",),
        system_changes: Sequence[str] = all_changes,
    ) -> None:
        """Fill ``results``; called by ASE.

        Raises
        ------
        EhmoError
            See the class.
        """
        super().calculate(atoms, properties, system_changes)  # type: ignore[no-untyped-call]
        found = self.model.energy(
            self._fragment(self.atoms), gradient="forces" in properties, dipole="dipole" in properties
        )
        self.results = {
            "energy": found.total_eV,
            "free_energy": found.free_eV,
            "charges": np.array(found.charges),
        }
        if found.gradient_eV_per_A is not None:
            self.results["forces"] = -found.gradient_eV_per_A
        if found.dipole_e_A is not None:
            self.results["dipole"] = np.array(found.dipole_e_A)

    def _fragment(self, atoms: Any) -> Fragment:
        if atoms.pbc.any():
            raise InputError(
                "the atoms are periodic, and energies are of molecules only",
                mend="set atoms.pbc = False for a molecule; ehmo bond FILE.cif calculates crystals",
            )
        symbols = tuple(atoms.get_chemical_symbols())
        unpaired = self.unpaired_electrons
        if unpaired is None:
            elements = (self.model.table.elements.get(symbol) for symbol in symbols)
            unpaired = (sum(element.valence_electrons for element in elements if element) - self.charge) % 2
        return Fragment(symbols, atoms.positions, self.charge, unpaired)
