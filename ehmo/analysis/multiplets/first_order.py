"""Textbook formulas of first order, to set beside the full calculation."""

from __future__ import annotations

from ehmo.units import ELECTRON_G


def d1_square_pyramid_g(
    zeta_per_cm: float,
    energy_b1_per_cm: float,
    energy_e_per_cm: float,
    share_b2: float = 1.0,
    share_b1: float = 1.0,
    share_e: float = 1.0,
) -> tuple[float, float]:
    """Values g_par and g_perp of d1 in C4v with the electron in b2 (d_xy).

    Parameters
    ----------
    zeta_per_cm : float
        One-electron spin-orbit constant [cm^-1].
    energy_b1_per_cm, energy_e_per_cm : float
        b1 (d_x2-y2) and e (d_xz, d_yz) above b2 [cm^-1].
    share_b2, share_b1, share_e : float
        Metal shares of the orbitals, 0 to 1.

    Returns
    -------
    g_parallel, g_perpendicular : float

    Notes
    -----
    g_par = g_e - 8 zeta a2(b2) a2(b1)/E(b1), g_perp = g_e - 2 zeta a2(b2) a2(e)/E(e). Spin-orbit coupling on the
    ligands and charge-transfer states are left out.

    Examples
    --------
    >>> parallel, perpendicular = d1_square_pyramid_g(170, 16000, 13000)
    >>> round(parallel, 3), round(perpendicular, 3)
    (1.917, 1.976)

    References
    ----------
    .. [1] ballhausen-1962: C. J. Ballhausen, Introduction to Ligand Field Theory, McGraw-Hill 1962 (from memory).
    """
    parallel = ELECTRON_G - 8 * zeta_per_cm * share_b2 * share_b1 / energy_b1_per_cm
    perpendicular = ELECTRON_G - 2 * zeta_per_cm * share_b2 * share_e / energy_e_per_cm
    return parallel, perpendicular


def octahedral_g(lambda_per_cm: float, delta_per_cm: float, orbital_reduction: float = 1.0) -> float:
    """Isotropic g of an orbital singlet A2g of d3 or d8 in an octahedron.

    Parameters
    ----------
    lambda_per_cm : float
        Spin-orbit constant of the term: zeta/3 for d3, -zeta/2 for d8 [cm^-1].
    delta_per_cm : float
        Energy of the first T2g term of the same spin, which is 10 Dq [cm^-1].
    orbital_reduction : float
        k; it enters twice, in the coupling and in the moment.

    Returns
    -------
    g : float
        g_e - 8 k^2 lambda / delta.

    References
    ----------
    .. [1] ballhausen-1962: C. J. Ballhausen, Introduction to Ligand Field Theory, McGraw-Hill 1962 (from memory).
    """
    return ELECTRON_G - 8 * orbital_reduction**2 * lambda_per_cm / delta_per_cm


def tetragonal_energies(Dq: float, Ds: float, Dt: float) -> dict[str, float]:
    """Energies of the d orbitals in a tetragonal field, from their barycentre.

    Parameters
    ----------
    Dq, Ds, Dt : float
        Field parameters; the energies have their unit.

    Returns
    -------
    energies : dict
        Keys ``b1`` (d_x2-y2), ``a1`` (d_z2), ``b2`` (d_xy) and ``e`` (d_xz, d_yz).

    References
    ----------
    .. [1] ballhausen-1962: C. J. Ballhausen, Introduction to Ligand Field Theory, McGraw-Hill 1962 (from memory).
    """
    return {
        "b1": 6 * Dq + 2 * Ds - Dt,
        "a1": 6 * Dq - 2 * Ds - 6 * Dt,
        "b2": -4 * Dq + 2 * Ds - Dt,
        "e": -4 * Dq - Ds + 4 * Dt,
    }
