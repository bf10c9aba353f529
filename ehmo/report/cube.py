"""Values on a grid as a cube file, and a fragment as XYZ."""

from __future__ import annotations

import tempfile
from collections.abc import Callable

import numpy as np

from ehmo.records.arrays import FloatArray
from ehmo.records.fragment import Fragment
from ehmo.records.grid import Grid

SMALLEST = 1e-6
"""Values are rounded to this, so that noise far from the atoms takes no room [bohr^-3/2]."""


def cube_text(fragment: Fragment, grid: Grid, values: FloatArray, comment: str) -> str:
    """Cube file of one orbital, through ASE: lengths in bohr, amplitudes in bohr^-3/2.

    Parameters
    ----------
    fragment : Fragment
        Atoms.
    grid : Grid
        Points.
    values : (nx, ny, nz) ndarray
        Amplitudes, rounded to `SMALLEST` [bohr^-3/2].
    comment : str
        First line.

    Returns
    -------
    text : str
    """
    from ase import Atoms
    from ase.io.cube import write_cube

    cell = np.diag(grid.spacing_A * grid.shape)
    atoms = Atoms(list(fragment.symbols), positions=fragment.positions_A, cell=cell)
    rounded = np.round(values / SMALLEST) * SMALLEST + 0.0
    # The writer hands the numbers to the operating system, which needs a true file.
    with tempfile.TemporaryFile("w+", encoding="ascii", errors="replace") as file:
        write: Callable[..., None] = write_cube
        write(file, atoms, data=rounded, origin=grid.origin_A, comment=" ".join(comment.split()) or "orbital")
        file.flush()
        file.seek(0)
        return file.read()


def xyz_text(fragment: Fragment) -> str:
    """XYZ file with charge and unpaired electrons in its comment line, as `ehmo` reads them.

    Parameters
    ----------
    fragment : Fragment

    Returns
    -------
    text : str
        The title of the source is left out: it may say anything.
    """
    known = (("charge", fragment.charge), ("unpaired", fragment.unpaired_electrons))
    comment = " ".join(f"{name}={value}" for name, value in known if value is not None)
    lines = [str(len(fragment)), comment]
    for symbol, place in zip(fragment.symbols, fragment.positions_A, strict=True):
        lines.append(f"{symbol:2s} " + " ".join(f"{value:14.8f}" for value in place))
    return "\n".join(lines) + "\n"
