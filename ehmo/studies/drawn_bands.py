"""Bands of a report in every draw of its parameters."""

from __future__ import annotations

from dataclasses import dataclass

import numpy as np
from numpy.typing import NDArray

from ehmo.analysis.bands import SAME_TERM_PER_CM
from ehmo.analysis.multiplets import term_energies
from ehmo.calculate.sites import group_axes_in_frame
from ehmo.records.arrays import FloatArray
from ehmo.records.multiplets import ElectronRepulsion, Term, Terms
from ehmo.records.options import Options
from ehmo.records.report import BondReport
from ehmo.records.site import ShellConstants
from ehmo.studies.ensemble import DrawNumbers
from ehmo.units import PER_CM_PER_EV


def band_energies(
    report: BondReport, options: Options, numbers: DrawNumbers, followed: tuple[int, ...]
) -> list[FloatArray | None]:
    """Wavenumber of each band of a report in every draw.

    Parameters
    ----------
    report : BondReport
        Undrawn calculation.
    options : Options
        Options that it was made with.
    numbers : DrawNumbers
        Ladders and followed orbitals of the draws.
    followed : tuple of int
        Orbitals that were followed.

    Returns
    -------
    bands : list of (n_draws,) ndarray or None
        In the order of the bands; None for one that is not followed [cm^-1].
    """
    place = {orbital: column for column, orbital in enumerate(followed)}
    within = iter(_shell_bands(report, options, numbers))
    bands: list[FloatArray | None] = []
    for band in report.spectroscopy.bands:
        if band.orbitals is None:
            bands.append(next(within, None))
        else:
            lower, upper = (numbers.followed_eV[:, place[orbital]] for orbital in band.orbitals)
            bands.append((upper - lower) * PER_CM_PER_EV)
    return bands


def _shell_bands(report: BondReport, options: Options, numbers: DrawNumbers) -> list[FloatArray]:
    """Bands within the shell: one for each term above the ground term, in the order of the report's terms."""
    terms, constants = report.spectroscopy.terms, report.spectroscopy.constants
    if terms is None or constants is None or len(numbers.ladders) != 1:
        return []
    ground = terms.lowest((report.fragment.unpaired_electrons or 0) + 1)
    if ground is None:
        return []
    drawn = _drawn_terms(report, terms, constants, options, numbers)
    above = [term for term in terms.terms if term.energy_per_cm - ground.energy_per_cm >= SAME_TERM_PER_CM]
    return [drawn.energy(term) - drawn.energy(ground) for term in above]


@dataclass(frozen=True, slots=True, eq=False)
class _DrawnTerms:
    """Terms in the draws that have a ladder, to be looked up by those of the report."""

    terms: Terms
    energies: dict[tuple[int, str], FloatArray]
    kept: NDArray[np.bool_]

    def energy(self, term: Term) -> FloatArray:
        """(n_draws,) energy of a term; like ones are told apart by their order."""
        alike = [t for t in self.terms.terms if (t.multiplicity, t.irrep) == (term.multiplicity, term.irrep)]
        values = np.full(len(self.kept), np.nan)
        values[self.kept] = self.energies[term.multiplicity, term.irrep][:, alike.index(term)]
        return values


def _drawn_terms(
    report: BondReport, terms: Terms, constants: ShellConstants, options: Options, numbers: DrawNumbers
) -> _DrawnTerms:
    (followed,), (site,), (frame,) = numbers.ladders, report.sites, report.coordination.frames
    kept = ~np.isnan(followed.energies_eV[:, 0])
    # The constants of the report are those of the free ion times the square of the mean metal share.
    factors = followed.metal_shares[kept].mean(axis=1) ** 2 / constants.repulsion_factor
    if options.racah_B_per_cm is not None:
        factors = np.ones(len(factors))
    energies = term_energies(
        followed.field_eV[kept],
        terms.n_electrons,
        factors[:, None] * _slater_integrals(constants)[: terms.l],
        site.symmetry.group,
        group_axes_in_frame(site.symmetry, frame),
    )
    return _DrawnTerms(terms, energies, kept)


def _slater_integrals(constants: ShellConstants) -> FloatArray:
    """F^2, F^4, F^6 as the report used them; zero where nothing repels [cm^-1]."""
    if constants.racah_B_per_cm is not None and constants.racah_C_per_cm is not None:
        repulsion = ElectronRepulsion.from_racah(constants.racah_B_per_cm, constants.racah_C_per_cm)
        return np.array([repulsion.F2_per_cm, repulsion.F4_per_cm, 0.0])
    return np.array([constants.F2_per_cm or 0.0, constants.F4_per_cm or 0.0, constants.F6_per_cm or 0.0])
