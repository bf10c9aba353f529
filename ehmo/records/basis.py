"""Valence basis functions of a fragment, as parallel arrays."""

from __future__ import annotations

from dataclasses import dataclass, field

import numpy as np

from ehmo.conventions import ORBITAL_NAMES, SHELL_LETTERS
from ehmo.records.arrays import FloatArray, IntArray, frozen_floats, frozen_ints


@dataclass(frozen=True, slots=True, eq=False)
class Basis:
    """Basis functions in the order atom, shell, m.

    Attributes
    ----------
    symbols : tuple of str
        Chemical symbol of each atom.
    core_charges : (n_atoms,) ndarray
        Valence electrons of the neutral atom, which is the charge of its core.
    shell_atom, shell_n, shell_l : (n_shells,) ndarray of int
        Atom, principal and angular quantum number of each shell.
    shell_type : (n_shells,) ndarray of int
        Shells of one element with the same n, l share a type.
    type_h_ii_eV : (n_types,) ndarray
        Diagonal Hamiltonian element of each type [eV].
    """

    symbols: tuple[str, ...]
    core_charges: FloatArray
    shell_atom: IntArray
    shell_n: IntArray
    shell_l: IntArray
    shell_type: IntArray
    type_h_ii_eV: FloatArray
    shell_of: IntArray = field(init=False)
    """(n_ao,) Shell of each function."""
    atom_of: IntArray = field(init=False)
    """(n_ao,) Atom of each function."""
    type_of: IntArray = field(init=False)
    """(n_ao,) Shell type of each function."""
    shell_start: IntArray = field(init=False)
    """(n_shells,) First function of each shell."""
    layouts: tuple[tuple[int, ...], ...] = field(init=False)
    """Angular momentum quantum number l of each shell, per atom."""
    atom_start: IntArray = field(init=False)
    """(n_atoms + 1,) First function of each atom, then the number of functions."""

    def __post_init__(self) -> None:
        n_shells = len(self.shell_atom)
        put = object.__setattr__
        put(self, "core_charges", frozen_floats(self.core_charges, (len(self.symbols),), "core_charges"))
        for name in ("shell_atom", "shell_n", "shell_l", "shell_type"):
            put(self, name, frozen_ints(getattr(self, name), (n_shells,), name))
        put(self, "type_h_ii_eV", frozen_floats(self.type_h_ii_eV, (None,), "type_h_ii_eV"))
        sizes = 2 * self.shell_l + 1
        shell_of = np.repeat(np.arange(n_shells), sizes)
        starts = np.concatenate([[0], np.cumsum(sizes)])
        put(self, "shell_of", frozen_ints(shell_of, (None,), "shell_of"))
        put(self, "atom_of", frozen_ints(self.shell_atom[shell_of], (None,), "atom_of"))
        put(self, "type_of", frozen_ints(self.shell_type[shell_of], (None,), "type_of"))
        put(self, "shell_start", frozen_ints(starts[:-1], (n_shells,), "shell_start"))
        atom_start = np.searchsorted(self.atom_of, np.arange(len(self.symbols) + 1))
        put(self, "atom_start", frozen_ints(atom_start, (len(self.symbols) + 1,), "atom_start"))
        layouts: list[list[int]] = [[] for _ in self.symbols]
        for atom, l in zip(self.shell_atom, self.shell_l, strict=True):
            layouts[atom].append(int(l))
        put(self, "layouts", tuple(map(tuple, layouts)))

    def __len__(self) -> int:
        return len(self.shell_of)

    def functions_of(self, atom: int) -> slice:
        """Range of the functions of one atom."""
        return slice(int(self.atom_start[atom]), int(self.atom_start[atom + 1]))

    def shell_label(self, shell: int) -> str:
        """Label of a shell without its atom, such as ``3d``."""
        return f"{self.shell_n[shell]}{SHELL_LETTERS[self.shell_l[shell]]}"

    def function_label(self, index: int) -> str:
        """Label of a function without its atom, such as ``3dxy``."""
        shell = self.shell_of[index]
        name = ORBITAL_NAMES[self.shell_l[shell]][index - self.shell_start[shell]]
        return f"{self.shell_n[shell]}{name}"
