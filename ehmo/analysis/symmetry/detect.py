"""Point group of a coordination sphere or of a whole molecule, within a tolerance."""

from __future__ import annotations

from collections.abc import Iterator
from itertools import groupby
from typing import Final

import numpy as np
from numpy.typing import ArrayLike

from ehmo.analysis.symmetry.axes import settled_axes
from ehmo.analysis.symmetry.candidates import IMPROPER, PROPER, Elements, symmetry_elements
from ehmo.analysis.symmetry.fitting import GroupFit, fit_group, nearest_atoms
from ehmo.analysis.symmetry.groups import point_group
from ehmo.errors import InputError
from ehmo.records.arrays import FloatArray, IntArray
from ehmo.records.symmetry import Symmetry

SPHERE_TOLERANCE_A: Final = 0.2
"""Root mean square distance up to which a coordination sphere counts as symmetric [angstrom]."""

MOLECULE_TOLERANCE_A: Final = 0.05
"""The same for a whole molecule [angstrom]."""

SAME_LENGTH_A: Final = 0.1
"""Bond lengths with a wider gap between them are of different sorts [angstrom]."""

WIDEST_SORT_A: Final = 0.2
"""A chain of lengths that spans more is broken at its widest gap [angstrom]."""

_PERPENDICULAR: Final = 0.26  # cosine: 15 degrees off a right angle


def find_symmetry(
    positions_A: FloatArray,
    kinds: ArrayLike,
    atoms: ArrayLike | None = None,
    origin: int | None = None,
    tolerance_A: float | None = None,
    preferred_axes: FloatArray | None = None,
) -> Symmetry:
    """Point group of highest order that atoms have within a tolerance.

    Parameters
    ----------
    positions_A : (n_fragment, 3) ndarray
        Coordinates of all atoms of the fragment [angstrom].
    kinds : (n_fragment,) array_like of int
        Symmetry exchanges atoms of one kind only: atomic numbers, or numbers that tell donor kinds apart.
    atoms : (n_atoms,) array_like of int, optional
        Atoms to judge, such as a metal and its donors; all by default.
    origin : int, optional
        Atom at the fixed point: the metal of a coordination sphere. Donors of one kind are then told apart by
        their bond lengths, see `length_sorts`. By default the fixed point is the centre of the atoms.
    tolerance_A : float, optional
        Largest root mean square distance from the symmetrised positions, the atom at the fixed point not counted;
        0.2 for a sphere, 0.05 without origin [angstrom].
    preferred_axes : (3, 3) ndarray, optional
        Rows are the x, y, z to which the axes of the group are laid as near as its setting allows.

    Returns
    -------
    symmetry : Symmetry

    Raises
    ------
    InputError
        If no atoms are given, the tolerance is not positive, or the origin is not among the atoms.

    Notes
    -----
    Groups outside `GROUP_NAMES` are reported as their largest subgroup there: T_h as D2h. A single atom counts
    as Oh.

    References
    ----------
    .. [1] zabrodsky-1992: H. Zabrodsky, S. Peleg, D. Avnir, J. Am. Chem. Soc. 114, 7843 (1992).
    """
    kinds = np.asarray(kinds, dtype=np.intp)
    chosen = np.arange(len(positions_A)) if atoms is None else np.asarray(atoms, dtype=np.intp)
    if tolerance_A is None:
        tolerance_A = MOLECULE_TOLERANCE_A if origin is None else SPHERE_TOLERANCE_A
    _check(chosen, origin, tolerance_A)
    points = np.asarray(positions_A, dtype=np.float64)[chosen]
    centre = points.mean(axis=0) if origin is None else np.asarray(positions_A[origin], dtype=np.float64)
    vectors = points - centre
    colours = np.unique(kinds[chosen], return_inverse=True)[1]
    counted = chosen != (-1 if origin is None else origin)
    if origin is not None:
        colours = length_sorts(colours, np.linalg.norm(vectors, axis=1))
        colours[~counted] = colours.max() + 1
    allowed = tolerance_A**2 * max(int(counted.sum()), 1)
    fit = _best_fit(vectors, colours, allowed, tolerance_A)
    axes = settled_axes(fit.group.name, fit.axes, vectors, preferred_axes)
    symmetrised = fit.symmetrised_A @ fit.axes
    permutations = fit.permutations
    if len(fit.group) > 1:
        permutations, _ = nearest_atoms(fit.group.operations, symmetrised @ axes.T, colours)
    size = float((vectors**2).sum())
    return Symmetry(
        group=fit.group,
        atoms=chosen,
        axes=axes,
        origin_A=centre,
        permutations=permutations,
        symmetrised_A=symmetrised + centre,
        rms_A=float(np.sqrt(fit.squared_A2 / max(int(counted.sum()), 1))),
        continuous_measure=100 * fit.squared_A2 / size if size else 0.0,
    )


def _check(atoms: IntArray, origin: int | None, tolerance_A: float) -> None:
    if len(atoms) == 0:
        raise InputError("no atoms to find the symmetry of", mend="give at least one atom")
    if origin is not None and origin not in atoms:
        raise InputError(f"the fixed atom {origin} is not among the atoms judged", mend="add it to the atoms")
    if not 0 < tolerance_A < np.inf:
        raise InputError(f"the symmetry tolerance is {tolerance_A:g}", mend="give a positive length in angstrom")


def length_sorts(kinds: IntArray, lengths_A: FloatArray) -> IntArray:
    """Numbers that tell donors apart by kind and bond length.

    Lengths of one kind are sorted; a gap above 0.1 A parts them. Where a chain of lengths spans more than 0.2 A,
    its widest gap parts it too.

    Parameters
    ----------
    kinds : (n,) ndarray of int
    lengths_A : (n,) ndarray
        Bond lengths [angstrom].

    Returns
    -------
    sorts : (n,) ndarray of int
        Counted from 0.
    """
    sorts = np.empty(len(kinds), dtype=np.intp)
    count = 0
    for kind in np.unique(kinds):
        members = np.flatnonzero(kinds == kind)
        waiting = [members[np.argsort(lengths_A[members], kind="stable")]]
        while waiting:
            chain = waiting.pop()
            gaps = np.diff(lengths_A[chain])
            if len(gaps) and (gaps.max() > SAME_LENGTH_A or gaps.sum() > WIDEST_SORT_A):
                cut = int(gaps.argmax()) + 1
                waiting += [chain[:cut], chain[cut:]]
            else:
                sorts[chain] = count
                count += 1
    return sorts


def _best_fit(vectors: FloatArray, colours: IntArray, allowed: float, tolerance_A: float) -> GroupFit:
    """Fit of the highest group whose squared distances stay within what is allowed."""
    trivial = GroupFit(point_group("C1"), np.eye(3), np.arange(len(vectors))[None], vectors, 0.0)
    if not vectors.any():
        return fit_group(point_group("Oh"), vectors, colours, np.eye(3)) or trivial
    linear = _linear_fit(vectors, colours, allowed)
    if linear is not None:
        return linear
    loose = 2 * tolerance_A + 0.1  # a candidate direction may lie some degrees off the axis
    elements = symmetry_elements(vectors, colours, loose)
    guesses = sorted(_guesses(elements, loose), key=lambda guess: -len(point_group(guess[0])))
    for _, rank in groupby(guesses, key=lambda guess: len(point_group(guess[0]))):
        tried = [fit_group(point_group(name), vectors, colours, axes) for name, axes in rank]
        good = [fit for fit in tried if fit is not None and fit.squared_A2 <= allowed]
        if good:
            return min(good, key=lambda fit: fit.squared_A2)
    return trivial


def _linear_fit(vectors: FloatArray, colours: IntArray, allowed: float) -> GroupFit | None:
    """Fit of a linear group."""
    spread, directions = np.linalg.eigh(vectors.T @ vectors)
    if spread[:2].sum() > allowed:
        return None
    axes = directions.T * np.linalg.det(directions)
    for name in ("D∞h", "C∞v"):
        fit = fit_group(point_group(name), vectors, colours, axes)
        if fit is not None and fit.squared_A2 <= allowed:
            return fit
    return None


def _guesses(elements: Elements, loose: float) -> Iterator[tuple[str, FloatArray]]:
    """Groups that the elements found may add up to, each with a guess of its axes."""
    directions = elements.directions
    proper = {n: elements.proper[n] < loose for n in PROPER}
    improper = {n: elements.improper[n] < loose for n in IMPROPER}
    square = np.abs(directions @ directions.T) < _PERPENDICULAR
    yield from _cubic_guesses(elements, square, loose)
    for k, z in enumerate(directions):
        mirror = _best(elements.improper[1], square[k], loose)
        turn = _best(elements.proper[2], square[k], loose)
        for n in PROPER:
            if not proper[n][k]:
                continue
            yield f"C{n}", _axes(z, None)
            if improper[1][k]:
                yield f"C{n}h", _axes(z, None)
            if mirror is not None:
                yield f"C{n}v", _axes(z, np.cross(directions[mirror], z))
            if turn is not None:
                yield f"D{n}", _axes(z, directions[turn])
                if improper[1][k]:
                    yield f"D{n}h", _axes(z, directions[turn])
                if improper.get(2 * n, improper[1])[k]:
                    yield f"D{n}d", _axes(z, directions[turn])
        for n in (4, 6, 8):
            if improper[n][k]:
                yield f"S{n}", _axes(z, None)
        if improper[1][k]:
            yield "Cs", _axes(z, None)
    if elements.inversion < loose:
        yield "Ci", np.eye(3)


def _cubic_guesses(
    elements: Elements, square: np.ndarray[tuple[int, int], np.dtype[np.bool_]], loose: float
) -> Iterator[tuple[str, FloatArray]]:
    """Oh about two four-fold axes, Td about two S4 axes."""
    for name, residuals in (("Oh", elements.proper[4]), ("Td", elements.improper[4])):
        k = _best(residuals, np.ones(len(residuals), dtype=bool), loose)
        other = None if k is None else _best(residuals, square[k], loose)
        if k is not None and other is not None:
            yield name, _axes(elements.directions[k], elements.directions[other])


def _best(residuals: FloatArray, among: np.ndarray[tuple[int], np.dtype[np.bool_]], loose: float) -> int | None:
    """Place of the least residual among some, if it is small enough."""
    left = np.where(among, residuals, np.inf)
    best = int(left.argmin())
    return best if left[best] < loose else None


def _axes(z: FloatArray, x: FloatArray | None) -> FloatArray:
    """Right-handed axes with z as given and x as near as may be."""
    guide = np.eye(3)[np.argmin(np.abs(z))] if x is None else x
    across = guide - (guide @ z) * z
    across /= np.linalg.norm(across)
    return np.array([across, np.cross(z, across), z])
