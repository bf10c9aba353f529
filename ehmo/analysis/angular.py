"""Angular parts of donor functions about a metal: what angular overlap and bond counting share."""

from __future__ import annotations

from ehmo.harmonics import axis_rotations, harmonic_rotations
from ehmo.records.arrays import FloatArray


def donor_functions(directions: FloatArray, l: int) -> FloatArray:
    """Combinations of a metal shell that point at each donor with sigma and pi symmetry.

    Parameters
    ----------
    directions : (n_donors, 3) ndarray
        Unit vectors from the metal.
    l : int
        Angular momentum quantum number of the shell, at least 1.

    Returns
    -------
    functions : (n_donors, 3, 2l+1) ndarray
        Row 0 is sigma, rows 1 and 2 are pi along the two columns of `pi_axes`; each is normalised. The squares of
        a function's elements are its angular-overlap factors.

    References
    ----------
    .. [1] schaffer-1965: C. E. Schäffer, C. K. Jørgensen, Mol. Phys. 9, 401 (1965).
    """
    turned = harmonic_rotations(axis_rotations(directions), l)
    return turned[:, :, [l, l + 1, l - 1]].swapaxes(1, 2)


def pi_axes(directions: FloatArray) -> FloatArray:
    """(n_donors, 3, 2) unit vectors across each bond that the two pi functions lie along."""
    return axis_rotations(directions)[:, :, :2]
