"""Crystal-field and angular-overlap parameters of a ladder."""

from __future__ import annotations

from collections.abc import Sequence

import numpy as np

from ehmo.analysis.angular import donor_functions
from ehmo.records.arrays import FloatArray
from ehmo.records.coordination import DonorKind
from ehmo.records.ligand_field import AngularOverlap, Ladder, LigandFieldParameters
from ehmo.units import PER_CM_PER_EV

SATURATED_KINDS = frozenset(
    {DonorKind.AMINE, DonorKind.PHOSPHINE, DonorKind.ALKYL, DonorKind.HYDRIDO, DonorKind.SIDE_ON_CARBON}
)
"""Donors without a function of their own for pi bonding: e_pi is zero by convention."""

_OPEN = 1e-3
"""Combinations whose factors are smaller than this share of the largest are left open by the geometry."""


def angular_overlap(
    ladder: Ladder, directions: FloatArray, kinds: Sequence[DonorKind], crystal_field: dict[str, float]
) -> LigandFieldParameters:
    """Angular-overlap parameters by least squares against the effective matrix.

    The matrix is the reference, times one, plus e_sigma of each donor times its sigma function with itself, plus
    e_pi times its two pi functions. The reference is the calculation's own diagonal element, so nothing is shifted
    to fit.

    Parameters
    ----------
    ladder : Ladder
        Effective field in the local axes.
    directions : (n_donors, 3) ndarray
        Unit vectors to the donors in the same axes.
    kinds : sequence of DonorKind
        One per donor; donors of one kind share their parameters.
    crystal_field : dict of str to float
        From `crystal_field_parameters`, carried along [cm^-1].

    Returns
    -------
    parameters : LigandFieldParameters

    References
    ----------
    .. [1] schaffer-1965: C. E. Schäffer, C. K. Jørgensen, Mol. Phys. 9, 401 (1965).
    """
    functions = donor_functions(directions, ladder.angular_momentum)
    names: list[tuple[str, str]] = []
    columns = []
    for kind in dict.fromkeys(kinds):
        own = functions[[k == kind for k in kinds]]
        names.append((str(kind), "sigma"))
        columns.append(np.einsum("da,db->ab", own[:, 0], own[:, 0]).ravel())
        if kind not in SATURATED_KINDS:
            names.append((str(kind), "pi"))
            columns.append(np.einsum("dpa,dpb->ab", own[:, 1:], own[:, 1:]).ravel())
    design = np.array(columns).T
    target = (ladder.field_eV - ladder.reference_eV * np.eye(len(ladder.levels))).ravel()
    left, singular, right = np.linalg.svd(design, full_matrices=False)
    kept = singular > _OPEN * singular[0]
    values = right[kept].T @ ((left[:, kept].T @ target) / singular[kept])
    open_directions = right[~kept]
    free = (open_directions**2).sum(axis=0) > _OPEN
    misfit = design @ values - target
    return LigandFieldParameters(
        crystal_field_per_cm=crystal_field,
        angular_overlap=tuple(
            AngularOverlap(kind, symmetry, None if open_ else float(value))
            for (kind, symmetry), value, open_ in zip(names, values, free, strict=True)
        ),
        undetermined=tuple(_combination(names, direction) for direction in open_directions),
        rms_per_cm=float(np.sqrt((misfit**2).mean())) * PER_CM_PER_EV,
    )


def _combination(names: Sequence[tuple[str, str]], direction: FloatArray) -> str:
    scaled = direction / direction[np.abs(direction).argmax()]
    terms = [
        f"{value:+.2f} e_{symmetry}({kind})"
        for (kind, symmetry), value in zip(names, scaled, strict=True)
        if abs(value) > 0.01
    ]
    return " ".join(terms).removeprefix("+")


def crystal_field_parameters(field_eV: FloatArray, group: str) -> dict[str, float]:
    """Dq, and Ds and Dt in tetragonal fields, from a field in its own tetragonal or cubic axes.

    With the barycentre removed b1 = 6 Dq + 2 Ds - Dt, a1 = 6 Dq - 2 Ds - 6 Dt, b2 = -4 Dq + 2 Ds - Dt and
    e = -4 Dq - Ds + 4 Dt.

    Parameters
    ----------
    field_eV : (5, 5) ndarray
        Effective matrix with z along the fourfold axis and x in a plane of dx2-y2 [eV].
    group : str
        Schoenflies symbol of the idealised sphere.

    Returns
    -------
    parameters : dict of str to float
        Empty in other groups [cm^-1].

    References
    ----------
    .. [1] ballhausen-1962: C. J. Ballhausen, Introduction to Ligand Field Theory, McGraw-Hill 1962, chapter 4.
    """
    xy, yz, z2, xz, x2y2 = np.diag(field_eV) * PER_CM_PER_EV
    if group in ("Oh", "Td"):
        # The upper set less the lower one: eg over t2g in Oh, t2 over e in Td.
        splitting = ((z2 + x2y2) / 2 - (xy + yz + xz) / 3) * (1 if group == "Oh" else -1)
        return {"10Dq": float(splitting), "Dq": float(splitting / 10)}
    if group not in ("C4v", "D4h", "D4", "C4", "C4h", "D2d", "D4d"):
        return {}
    levels = np.array([x2y2, z2, xy, (xz + yz) / 2])
    levels = levels - (x2y2 + z2 + xy + xz + yz) / 5
    factors = np.array([[6.0, 2.0, -1.0], [6.0, -2.0, -6.0], [-4.0, 2.0, -1.0], [-4.0, -1.0, 4.0]])
    dq, ds, dt = np.linalg.lstsq(factors, levels, rcond=None)[0]
    return {"Dq": float(dq), "Ds": float(ds), "Dt": float(dt)}
