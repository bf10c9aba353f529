"""Terms, bands and magnetism of a fragment with one metal, from its ladder and the constants of the free ion."""

from __future__ import annotations

from dataclasses import dataclass, replace

import numpy as np

import basis_params
from basis_params import ParameterTable
from ehmo.analysis.band_fit import FieldModel, fit_bands
from ehmo.analysis.bands import SAME_TERM_PER_CM, OrbitalLabels, charge_transfer_bands, shell_bands
from ehmo.analysis.multiplets import (
    configuration_terms,
    d1_square_pyramid_g,
    magnetic_properties,
    multiplet_terms,
    reduced_momentum,
)
from ehmo.calculate.numbers import Bonding
from ehmo.calculate.sites import group_axes_in_frame
from ehmo.errors import EhmoError, MultipletError
from ehmo.orbitals.dipole import dipole_integrals
from ehmo.records.arrays import FloatArray
from ehmo.records.bands import BandFit
from ehmo.records.coordination import Coordination
from ehmo.records.fragment import Fragment
from ehmo.records.ligand_field import Ladder
from ehmo.records.multiplets import ElectronRepulsion, Magnetism, Term, Terms
from ehmo.records.options import Options
from ehmo.records.site import MetalSite, ShellConstants, Spectroscopy
from ehmo.records.symmetry import OrbitalIrreps
from ehmo.structure.elements import F_BLOCK
from ehmo.units import PER_CM_PER_EV

_WHOLE = 0.01
"""Electrons of a level farther than this from a whole number make no configuration."""

_TETRAGONAL = ("C4v", "D4h", "D4", "C4")


def spectroscopy(
    fragment: Fragment,
    coordination: Coordination,
    sites: tuple[MetalSite, ...],
    irreps: OrbitalIrreps | None,
    bonding: Bonding,
    table: ParameterTable,
    options: Options,
    *,
    magnetism: bool = True,
    charge_transfer: bool = True,
) -> Spectroscopy:
    """Terms, bands and magnetism; what cannot be had is withheld with the reason.

    Parameters
    ----------
    fragment : Fragment
    coordination : Coordination
    sites : tuple of MetalSite
    irreps : OrbitalIrreps or None
        Labels of the orbitals in the group of the sphere.
    bonding : Bonding
    table : ParameterTable
        Set that the calculation was made with.
    options : Options
        Racah B, oxidation state and observed bands, if given.
    magnetism : bool
        Whether spin-orbit levels, moment, D, E and g are wanted.
    charge_transfer : bool
        Whether charge-transfer bands and oscillator strengths are wanted; they take most of the time where the
        exponents are new.

    Returns
    -------
    spectroscopy : Spectroscopy
    """
    if len(sites) > 1:
        return _nothing(f"terms, bands and magnetism: the fragment has {len(sites)} metals")
    (site,), (frame,) = sites, coordination.frames
    if site.ladder is None:
        return _nothing(f"terms, bands and magnetism: {site.ladder_withheld}")
    shell = _Shell(site, site.ladder, group_axes_in_frame(site.symmetry, frame), fragment.unpaired_electrons or 0)
    n = len(bonding.plan.basis)
    dipoles = (
        dipole_integrals(bonding.plan, table, fragment.positions_A, bonding.overlap.matrix)
        if charge_transfer
        else np.zeros((3, n, n))
    )
    found = _shell_results(
        fragment, shell, _ladder_dipoles(site.ladder, bonding, dipoles), options, with_magnetism=magnetism
    )
    if not charge_transfer:
        return replace(found, bands=tuple(replace(band, oscillator_strength=None) for band in found.bands))
    labels = OrbitalLabels(site.symmetry.group, irreps.labels if irreps else ("",) * len(bonding.state.energies_eV))
    orbitals = [level.orbital for level in site.ladder.levels if level.orbital is not None]
    transfer = charge_transfer_bands(
        bonding.state, labels, orbitals, dipoles, site.symmetry.axes, bonding.populations.orbital_shares[:, 0]
    )
    withheld = found.withheld
    if options.observed_bands_per_cm and found.fit is None and not any("observed bands" in said for said in withheld):
        withheld = (*withheld, "fit to the observed bands: there are no terms to assign them to")
    return replace(found, bands=found.bands + transfer, withheld=withheld)


def _shell_results(
    fragment: Fragment, shell: _Shell, dipoles_A: FloatArray, options: Options, *, with_magnetism: bool
) -> Spectroscopy:
    """Terms of the open shell and what follows from them, each part as far as it can be had."""
    group, closed = shell.site.symmetry.group, 2 * len(shell.ladder.levels)
    if (fragment.symbols[shell.site.metal] in F_BLOCK) is not (shell.ladder.angular_momentum == 3):
        return _nothing("terms, bands within the shell and magnetism: the counted f shell has no functions in this set")
    if shell.n_electrons in (0, closed):
        return replace(
            _nothing("terms, bands within the shell and magnetism: the shell is empty or full"),
            ground_term=f"1{group.term_irreps[0]}" if shell.unpaired == 0 else "",
        )
    try:
        constants, repulsion = _constants(fragment, shell.site, shell.ladder, shell.n_electrons, options)
        terms = multiplet_terms(shell.ladder.field_eV, shell.n_electrons, repulsion, group, shell.group_axes)
    except EhmoError as error:
        return replace(
            _nothing(f"terms, bands within the shell and magnetism: {error}"), ground_term=_term_by_symmetry(shell)
        )
    ground = terms.lowest(shell.unpaired + 1)
    if ground is None:
        return replace(
            _nothing(f"bands and magnetism: the shell has no terms with {shell.unpaired} unpaired electrons"),
            constants=constants,
            terms=terms,
        )
    withheld: list[str] = []
    magnetism, fitted, fit = None, None, None
    if not with_magnetism:
        pass
    elif ground is terms.ground:
        magnetism, missing = _magnetism(shell, shell.ladder.field_eV, constants, repulsion)
        withheld += missing
    else:
        withheld.append(
            f"magnetism: the lowest term of the computed ladder, {terms.ground.label}, has not the "
            f"{shell.unpaired} unpaired electrons of the calculation; the ladder may be too wide"
        )
    if options.observed_bands_per_cm:
        fit, missing = _fit(shell, constants, repulsion, options)
        withheld += missing
        if fit is not None and with_magnetism:
            scaled = None if repulsion is None else repulsion.scaled(fit.repulsion_scale)
            fitted, _ = _magnetism(shell, fit.field_eV, constants, scaled)
    return Spectroscopy(
        constants=constants,
        terms=terms,
        ground_term=_ground_labels(terms, ground),
        bands=shell_bands(terms, ground, group, shell.ladder, dipoles_A),
        magnetism=magnetism,
        first_order_g=_first_order_g(shell, constants),
        fitted_magnetism=fitted,
        fit=fit,
        withheld=tuple(withheld),
    )


def _term_by_symmetry(shell: _Shell) -> str:
    """Ground term that the filling of the ladder alone allows, with as many unpaired electrons; empty if not one."""
    group = shell.site.symmetry.group
    sizes = dict(zip(group.irreps, group.dimensions.tolist(), strict=True))
    configuration, left = [], list(shell.ladder.levels)
    while left:
        irrep = left[0].irrep
        members, left = left[: sizes.get(irrep, 1)], left[sizes.get(irrep, 1) :]
        held = sum(level.electrons for level in members)
        if {level.irrep for level in members} != {irrep} or len(members) != sizes.get(irrep):
            return ""
        if abs(held - round(held)) > _WHOLE:
            return ""
        configuration.append((irrep, round(held)))
    if sum(count for _, count in configuration) != shell.n_electrons:
        return ""
    found = {
        f"{multiplicity}{irrep}"
        for multiplicity, irrep, _ in configuration_terms(group, configuration)
        if multiplicity == shell.unpaired + 1
    }
    return found.pop() if len(found) == 1 else ""


def _ground_labels(terms: Terms, ground: Term) -> str:
    """Label of the ground term, with those that no calculation could tell from it."""
    alike = {
        term.label
        for term in terms.terms
        if term.multiplicity == ground.multiplicity
        and abs(term.energy_per_cm - ground.energy_per_cm) < SAME_TERM_PER_CM
    }
    return " or ".join(sorted(alike))


@dataclass(frozen=True, slots=True, eq=False)
class _Shell:
    """The open shell of the one metal."""

    site: MetalSite
    ladder: Ladder
    group_axes: FloatArray
    unpaired: int

    @property
    def n_electrons(self) -> int:
        """Electrons by counting, else those that the calculation put in the ladder."""
        held = sum(level.electrons for level in self.ladder.levels)
        return round(held) if self.site.d_count is None else self.site.d_count

    @property
    def shares(self) -> FloatArray:
        """Metal share of each level."""
        return np.array([level.metal_share for level in self.ladder.levels])


def _nothing(reason: str) -> Spectroscopy:
    return Spectroscopy(None, None, "", (), None, None, None, None, (reason,))


def _ladder_dipoles(ladder: Ladder, bonding: Bonding, dipoles: FloatArray) -> FloatArray:
    """(3, n, n) dipole matrices among the orbitals of the ladder [angstrom]."""
    orbitals = [level.orbital for level in ladder.levels if level.orbital is not None]
    columns = bonding.state.coefficients[:, orbitals]
    matrices: FloatArray = columns.T @ dipoles @ columns
    return matrices


def _constants(
    fragment: Fragment, site: MetalSite, ladder: Ladder, n_electrons: int, options: Options
) -> tuple[ShellConstants, ElectronRepulsion | None]:
    """Constants of the free ion, and the repulsion reduced by the square of the mean metal share."""
    symbol, state = fragment.symbols[site.metal], site.oxidation_state
    if state is None:
        raise MultipletError("the oxidation state cannot be counted", mend="give it with --oxidation-state")
    mean = float(np.mean([level.metal_share for level in ladder.levels]))
    factor, ion, sources = mean**2, f"{symbol}{state}+", []
    B = C = F2 = F4 = F6 = zeta = None
    repulsion = None
    if n_electrons in (1, 4 * ladder.angular_momentum + 1):
        pass  # one electron or one hole: nothing repels it within the shell
    elif ladder.angular_momentum == 2:
        try:
            row = basis_params.racah(symbol, state)
        except KeyError:
            row = None
        if options.racah_B_per_cm is not None:
            B, factor = options.racah_B_per_cm, 1.0
            C = B * (row.C_per_cm / row.B_per_cm if row else 4.0)
            ratio = f"C/B of {row.source_key}" if row else "C = 4 B (common practice)"
            sources.append(f"B as given, {ratio}")
        elif row is not None:
            B, C = factor * row.B_per_cm, factor * row.C_per_cm
            sources.append(row.source_key)
        if B is not None and C is not None:
            repulsion = ElectronRepulsion.from_racah(B, C)
    else:
        try:
            integrals = basis_params.slater_integrals(symbol, state)
        except KeyError:
            pass
        else:
            F2, F4, F6 = (factor * f for f in (integrals.F2_per_cm, integrals.F4_per_cm, integrals.F6_per_cm))
            repulsion = ElectronRepulsion(F2, F4, F6)
            sources.append(integrals.source_key)
    try:
        coupling = basis_params.spin_orbit(symbol, state)
    except KeyError:
        pass
    else:
        zeta = coupling.zeta_per_cm
        sources.append(coupling.source_key)
    return ShellConstants(ion, B, C, F2, F4, F6, zeta, factor, mean, tuple(dict.fromkeys(sources))), repulsion


def _magnetism(
    shell: _Shell, field_eV: FloatArray, constants: ShellConstants, repulsion: ElectronRepulsion | None
) -> tuple[Magnetism | None, list[str]]:
    if constants.zeta_per_cm is None:
        return None, [f"magnetism: no spin-orbit constant of {constants.ion} is tabulated"]
    momentum = reduced_momentum(shell.ladder.angular_momentum, shell.ladder.vectors, shell.shares)
    try:
        return (
            magnetic_properties(field_eV, shell.n_electrons, repulsion, constants.zeta_per_cm, momentum),
            [],
        )
    except EhmoError as error:
        return None, [f"magnetism: {error}"]


def _first_order_g(shell: _Shell, constants: ShellConstants | None) -> tuple[float, float] | None:
    """Textbook values for one electron in dxy of a tetragonal ion."""
    if constants is None or constants.zeta_per_cm is None or shell.n_electrons != 1:
        return None
    if shell.ladder.angular_momentum != 2 or shell.site.symmetry.group.name not in _TETRAGONAL:
        return None
    by_function = {level.function: level for level in shell.ladder.levels}
    if shell.ladder.levels[0].function != "dxy" or not {"dxz", "dyz", "dx2-y2"} <= by_function.keys():
        return None
    ground = by_function["dxy"]
    e_energy = (by_function["dxz"].energy_eV + by_function["dyz"].energy_eV) / 2 - ground.energy_eV
    e_share = (by_function["dxz"].metal_share + by_function["dyz"].metal_share) / 2
    return d1_square_pyramid_g(
        constants.zeta_per_cm,
        (by_function["dx2-y2"].energy_eV - ground.energy_eV) * PER_CM_PER_EV,
        e_energy * PER_CM_PER_EV,
        ground.metal_share,
        by_function["dx2-y2"].metal_share,
        e_share,
    )


def _fit(
    shell: _Shell, constants: ShellConstants, repulsion: ElectronRepulsion | None, options: Options
) -> tuple[BandFit | None, list[str]]:
    model = FieldModel(
        shell.ladder.field_eV,
        shell.n_electrons,
        repulsion,
        constants.racah_B_per_cm or 0.0,
        shell.site.symmetry.group,
        shell.group_axes,
        shell.unpaired + 1,
    )
    try:
        return fit_bands(model, options.observed_bands_per_cm, options.observed_terms), []
    except EhmoError as error:
        return None, [f"fit to the observed bands: {error}"]
