"""Orbitals as values on a regular grid.

A shell with coefficients c_m contributes R(r) r^-l times the homogeneous polynomial sum_m c_m r^l Y_lm(x, y, z). On a
grid along x, y, z the polynomial is a sum of products of powers of the three coordinates, so that an orbital costs
one exponential per exponent and atom, and one matrix product per shell.
"""

from __future__ import annotations

from functools import cache

import numpy as np

from basis_params import ParameterTable
from ehmo.harmonics import real_harmonics
from ehmo.orbitals.parameters import element_parameters
from ehmo.orbitals.radial import Primitive, RadialFunction, orthogonal_radial_functions
from ehmo.records.arrays import FloatArray
from ehmo.records.basis import Basis
from ehmo.records.grid import Grid
from ehmo.units import BOHR_A

NEGLECTED_AMPLITUDE = 1e-5
"""Where an atom adds less to every orbital, it is left out [bohr^-3/2]."""

_RADII_BOHR = np.linspace(0.0, 60.0, 601)


def grid_around(positions_A: FloatArray, margin_A: float, spacing_A: float, most_points: int | None = None) -> Grid:
    """Grid over a box that holds some atoms.

    Parameters
    ----------
    positions_A : (n_atoms, 3) ndarray
        Atoms in the box [angstrom].
    margin_A : float
        Room on each side of the outermost atoms [angstrom].
    spacing_A : float
        Distance of neighbouring points [angstrom].
    most_points : int, optional
        Widen the spacing until the grid has no more points than that.

    Returns
    -------
    grid : Grid
        Its points fill the box evenly and centred.
    """
    lowest, highest = positions_A.min(axis=0) - margin_A, positions_A.max(axis=0) + margin_A
    if most_points is not None:
        spacing_A = max(spacing_A, float((highest - lowest).prod() / most_points) ** (1 / 3))
    while True:
        counts = np.ceil((highest - lowest) / spacing_A).astype(int) + 1
        if most_points is None or counts.prod() <= most_points:
            break
        spacing_A *= 1.01
    origin = (lowest + highest - spacing_A * (counts - 1)) / 2
    return Grid(origin, np.full(3, spacing_A), (int(counts[0]), int(counts[1]), int(counts[2])))


def grid_values(
    coefficients: FloatArray, basis: Basis, positions_A: FloatArray, table: ParameterTable, grid: Grid
) -> FloatArray:
    """Values of orbitals on a grid.

    Parameters
    ----------
    coefficients : (n_ao, n_orbitals) ndarray
        One orbital per column, over the basis functions.
    basis : Basis
        Functions.
    positions_A : (n_atoms, 3) ndarray
        Coordinates [angstrom].
    table : ParameterTable
        The parameter set the basis was built from.
    grid : Grid
        Points.

    Returns
    -------
    values : (n_orbitals, nx, ny, nz) ndarray
        Amplitudes; their squares integrate to 1 over space in bohr [bohr^-3/2].

    Raises
    ------
    ParameterError
        If the set lacks an element.

    References
    ----------
    .. [1] slater-1930: J. C. Slater, Phys. Rev. 36, 57 (1930).
    """
    values = np.zeros((coefficients.shape[1], *grid.shape))
    axes = grid.axes_A()
    shells_of = [np.flatnonzero(basis.shell_atom == atom) for atom in range(len(basis.symbols))]
    for atom, symbol in enumerate(basis.symbols):
        functions = orthogonal_radial_functions(element_parameters(table, symbol).shells)
        parts = [
            coefficients[basis.shell_start[shell] : basis.shell_start[shell] + 2 * basis.shell_l[shell] + 1]
            for shell in shells_of[atom]
        ]
        offsets = [(axis - centre) / BOHR_A for axis, centre in zip(axes, positions_A[atom], strict=True)]
        box = _within(offsets, _reach_bohr(functions, parts))
        near = [offset[part] for offset, part in zip(offsets, box, strict=True)]
        if min(map(len, near)):
            values[(slice(None), *box)] += _atom_values(functions, parts, near)
    return values


def _atom_values(
    functions: tuple[RadialFunction, ...], parts: list[FloatArray], offsets: list[FloatArray]
) -> FloatArray:
    """(n_orbitals, nx, ny, nz) contribution of one atom; `parts` holds the coefficients of each shell."""
    x, y, z = offsets
    distances = ((x * x)[:, None] + y * y)[:, :, None] + z * z
    np.sqrt(distances, out=distances)
    decays: dict[float, FloatArray] = {}
    powers: dict[int, FloatArray] = {}
    total = np.zeros((parts[0].shape[1], *distances.shape))
    for function, part in zip(functions, parts, strict=True):
        if part.any():
            radial = _reduced_radial(function, distances, decays, powers)
            if function.l == 0:
                total += radial * (part[0] * real_harmonics(np.zeros((1, 3)), 0)[0, 0])[:, None, None, None]
            else:
                total += radial * _solid_harmonics(function.l, part, offsets)
    return total


def _reduced_radial(
    function: RadialFunction, distances: FloatArray, decays: dict[float, FloatArray], powers: dict[int, FloatArray]
) -> FloatArray:
    """R(r) / r^l; exponentials and powers are kept for the other shells of the atom."""
    by_zeta: dict[float, list[Primitive]] = {}
    for primitive in function.primitives:
        by_zeta.setdefault(primitive[1], []).append(primitive)
    radial: FloatArray | None = None
    for zeta, primitives in by_zeta.items():
        if zeta not in decays:
            decays[zeta] = np.exp(-zeta * distances)
        for n, _, weight in primitives:
            power = n - 1 - function.l
            for step in range(1, power + 1):
                if step not in powers:
                    powers[step] = powers[step - 1] * distances if step > 1 else distances
            term = decays[zeta] * weight
            if power:
                term *= powers[power]
            radial = term if radial is None else np.add(radial, term, out=radial)
    assert radial is not None
    return radial


def _solid_harmonics(l: int, part: FloatArray, offsets: list[FloatArray]) -> FloatArray:
    """(n_orbitals, nx, ny, nz) sum over m of c_m r^l Y_lm."""
    x, y, z = (offset[:, None] ** np.arange(l + 1) for offset in offsets)
    tensor = np.einsum("mo,mabc->oabc", part, _solid_tensor(l))
    plane = np.einsum("oabc,xa->oxbc", tensor, x)
    plane = np.einsum("oxbc,yb->oxyc", plane, y)
    values: FloatArray = plane @ z.T
    return values


@cache
def _solid_tensor(l: int) -> FloatArray:
    """(2l + 1, l + 1, l + 1, l + 1) coefficients of x^a y^b z^c in r^l Y_lm.

    They follow from the harmonics on more directions than there are monomials, and are exact up to rounding.
    """
    exponents = [(a, b, l - a - b) for a in range(l + 1) for b in range(l + 1 - a)]
    directions = np.random.default_rng(1).normal(size=(4 * len(exponents), 3))
    directions /= np.linalg.norm(directions, axis=1, keepdims=True)
    monomials = np.stack([(directions ** np.array(e)).prod(axis=1) for e in exponents], axis=1)
    solved = np.linalg.lstsq(monomials, real_harmonics(directions, l)[:, l * l :], rcond=None)[0]
    tensor = np.zeros((2 * l + 1, l + 1, l + 1, l + 1))
    for (a, b, c), row in zip(exponents, solved, strict=True):
        tensor[:, a, b, c] = row
    tensor[np.abs(tensor) < 1e-12] = 0.0
    tensor.setflags(write=False)
    return tensor


def _reach_bohr(functions: tuple[RadialFunction, ...], parts: list[FloatArray]) -> float:
    """Distance beyond which an atom adds next to nothing to any of the orbitals [bohr]; 0 if it adds nothing."""
    largest = sum(
        np.abs(part).max() * np.abs(_tabulated(function)) for function, part in zip(functions, parts, strict=True)
    )
    felt = np.flatnonzero(largest >= NEGLECTED_AMPLITUDE)
    return float(_RADII_BOHR[min(felt[-1] + 1, len(_RADII_BOHR) - 1)]) if len(felt) else 0.0


@cache
def _tabulated(function: RadialFunction) -> FloatArray:
    """(601,) radial function at the radii at which its reach is judged."""
    terms = [weight * _RADII_BOHR ** (n - 1) * np.exp(-zeta * _RADII_BOHR) for n, zeta, weight in function.primitives]
    values: FloatArray = np.sum(terms, axis=0)
    values.setflags(write=False)
    return values


def _within(offsets: list[FloatArray], reach: float) -> tuple[slice, slice, slice]:
    """Range of points along x, y and z that lie within reach of an atom."""
    bounds = [np.searchsorted(offset, (-reach, reach)) for offset in offsets]
    first, second, third = (slice(int(low), int(high)) for low, high in bounds)
    return first, second, third
