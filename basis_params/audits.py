"""Audits of a parameter table: norms, and radii and energies against free atoms from first principles.

A table passes if each function is normalised and if its mean radius and diagonal element lie within stated
factors of the atom's. The bounds are wide on purpose: functions meant for molecules are tighter than those of
free atoms, most of all the empty p shells of metals. They catch a wrong digit, element or exponent, no more.
A two-body term is held against the sum of the covalent radii and against the softness of closed shells.
"""

from __future__ import annotations

from collections.abc import Iterator
from dataclasses import dataclass
from typing import Literal

from basis_params.atomic_orbitals import AtomicOrbitalData, atomic_orbital
from basis_params.atoms import atom
from basis_params.model import ElementParameters, PairRepulsion, ParameterTable, Shell
from basis_params.slater import mean_radius, radial_moment

Check = Literal["norm", "radius", "energy", "ionisation", "range", "softness"]
Status = Literal["ok", "outlier", "no reference"]

# Allowed ratio table/reference by check; "promoted": shells that are empty in the ground state of the atom
BOUNDS: dict[tuple[Check, Literal["occupied", "promoted"]], tuple[float, float]] = {
    ("norm", "occupied"): (0.998, 1.002),
    ("norm", "promoted"): (0.998, 1.002),
    ("radius", "occupied"): (0.70, 1.30),
    ("radius", "promoted"): (0.50, 1.10),
    ("energy", "occupied"): (0.70, 1.60),
    ("energy", "promoted"): (0.70, 2.00),
    ("ionisation", "occupied"): (0.70, 1.60),
    ("range", "occupied"): (0.60, 1.40),
    ("softness", "occupied"): (0.30, 3.00),
}

BORN_MAYER_A = 0.345
"""Length over which the repulsion of ions in alkali halides falls to 1/e (Born & Mayer 1932; from memory) [A]."""


@dataclass(frozen=True, slots=True)
class AuditRow:
    """One check of one shell, or of one two-body term.

    Attributes
    ----------
    element, shell : str
        Such as ``V`` and ``3d``; ``V-O`` and ``pair`` of a two-body term.
    check : {"norm", "radius", "energy", "ionisation", "range", "softness"}
    value, reference : float
        Of the table and of the atom; radius in [bohr], energy and ionisation in [eV]. Range: middle of the calibrated
        lengths against the sum of covalent radii; softness: 1/B against that of closed shells [A].
    ratio : float
        value / reference; NaN without a reference.
    bounds : tuple of float
        Lowest and highest ratio that passes.
    status : {"ok", "outlier", "no reference"}
    """

    element: str
    shell: str
    check: Check
    value: float
    reference: float
    ratio: float
    bounds: tuple[float, float]
    status: Status


@dataclass(frozen=True, slots=True)
class AuditReport:
    """All checks of one table."""

    set_name: str
    rows: tuple[AuditRow, ...]

    @property
    def outliers(self) -> tuple[AuditRow, ...]:
        """Rows outside their bounds."""
        return tuple(row for row in self.rows if row.status == "outlier")


def audit(table: ParameterTable) -> AuditReport:
    """Audit every shell and every two-body term of a table.

    Raises
    ------
    KeyError
        If the table has an element beyond the atomic data (H to Cm).
    """
    shells = [row for element in table.elements.values() for row in _element(element)]
    return AuditReport(table.name, (*shells, *(row for pair in table.repulsion.values() for row in _pair(pair))))


def _element(element: ElementParameters) -> Iterator[AuditRow]:
    symbol = element.symbol
    for shell in element.shells:
        orbital = _orbital_or_none(symbol, shell)
        kind: Literal["occupied", "promoted"] = "occupied" if _filled(orbital) else "promoted"
        norm = radial_moment(shell.n, shell.zetas, shell.coefficients, 0)
        radius = mean_radius(shell.n, shell.zetas, shell.coefficients)
        yield _judged(symbol, shell.label, "norm", norm, 1.0, kind)
        yield _judged(symbol, shell.label, "radius", radius, orbital.r_mean_bohr if orbital else None, kind)
        yield _judged(symbol, shell.label, "energy", shell.h_ii_eV, orbital.energy_eV if orbital else None, kind)
    highest = _highest_filled_shell(element)
    if highest is not None:
        energy = -atom(symbol).ionisation_energy_eV
        yield _judged(symbol, highest.label, "ionisation", highest.h_ii_eV, energy, "occupied")


def _pair(pair: PairRepulsion) -> Iterator[AuditRow]:
    """Rows of a two-body term.

    References
    ----------
    born-1932
    """
    radii = atom(pair.first).covalent_radius_A + atom(pair.second).covalent_radius_A
    middle = (pair.lowest_A + pair.highest_A) / 2
    yield _judged(pair.label, "pair", "range", middle, radii, "occupied")
    yield _judged(pair.label, "pair", "softness", 1 / pair.decay_per_A, BORN_MAYER_A, "occupied")


def _orbital_or_none(symbol: str, shell: Shell) -> AtomicOrbitalData | None:
    try:
        return atomic_orbital(symbol, shell.n, shell.l)
    except KeyError:
        return None


def _filled(orbital: AtomicOrbitalData | None) -> bool:
    return orbital is not None and orbital.ground_electrons > 0


def _highest_filled_shell(element: ElementParameters) -> Shell | None:
    """Return the shell of highest h_ii among those filled in the atom, the one that is ionised first."""
    filled = [shell for shell in element.shells if _filled(_orbital_or_none(element.symbol, shell))]
    return max(filled, key=lambda shell: shell.h_ii_eV, default=None)


def _judged(
    symbol: str,
    shell: str,
    check: Check,
    value: float,
    reference: float | None,
    kind: Literal["occupied", "promoted"],
) -> AuditRow:
    low, high = BOUNDS[check, kind]
    if reference is None:
        nan = float("nan")
        return AuditRow(symbol, shell, check, value, nan, nan, (low, high), "no reference")
    ratio = value / reference
    status: Status = "ok" if low <= ratio <= high else "outlier"
    return AuditRow(symbol, shell, check, value, reference, ratio, (low, high), status)
