"""The whole way from the contents of a crystal to its report."""

from __future__ import annotations

import numpy as np

from basis_params import ModelSettings, ParameterTable
from ehmo.analysis.energy_curves import density_of_states, overlap_population_curves
from ehmo.calculate.crystal import CrystalOptions, crystal_bonding
from ehmo.calculate.numbers import channel_constants, effective_settings
from ehmo.electronic.band_filling import SHARP_GAP_EV
from ehmo.errors import EhmoError, InputError
from ehmo.orbitals.parameters import load_parameters
from ehmo.records.bloch import LatticeBond
from ehmo.records.crystal import CrystalContents, MetalDonorUnit
from ehmo.records.crystal_electronic import CrystalBonding
from ehmo.records.crystal_report import CrystalReport
from ehmo.records.options import Options
from ehmo.records.report import Method
from ehmo.structure.primitive import PrimitiveCell, primitive_cell

ORDER_CHANGE = 0.02
"""Changes of an order with the mesh above this call for a denser mesh."""


def crystal_report(
    contents: CrystalContents,
    params: str | ParameterTable = "standard",
    options: Options | None = None,
    crystal: CrystalOptions | None = None,
) -> CrystalReport:
    """Report on a crystal as one periodic whole: networks, counter-ions and solvent together.

    Parameters
    ----------
    contents : CrystalContents
        What a file holds; the cell must be complete.
    params : str or ParameterTable
        Name of a shipped set, path of a table, or a loaded table.
    options : Options, optional
        Choices as for a molecule; charge and unpaired electrons are those of one primitive cell.
    crystal : CrystalOptions, optional
        Mesh, path and the treatment of cations.

    Returns
    -------
    report : CrystalReport

    Raises
    ------
    EhmoError
        If hydrogens or ions are missing from the cell, or for any reason that `crystal_bonding` gives.
    """
    options, crystal = options or Options(), crystal or CrystalOptions()
    table = params if isinstance(params, ParameterTable) else load_parameters(params)
    settings = effective_settings(table.settings, options)
    try:
        _refuse_incomplete_cell(contents, options)
        return _report(contents, table, settings, options, crystal)
    except EhmoError as error:
        error.place = error.place or contents.source
        raise


def _refuse_incomplete_cell(contents: CrystalContents, options: Options) -> None:
    if options.charge is not None:
        return
    if contents.missing_hydrogens:
        raise InputError(
            f"the cell is not complete: {contents.missing_hydrogens[0].rstrip('.')}",
            mend="place the hydrogens with --hydrogens place, or state the charge of what the file lists with --charge",
        )
    outside = [one.formula for one in contents.species if not one.in_model and one.charge]
    if outside:
        raise InputError(
            f"ions on sites that the ordered model leaves out: {', '.join(outside)}",
            mend="state the charge of one primitive cell without them with --charge, and use --charges fixed",
        )


def _report(
    contents: CrystalContents,
    table: ParameterTable,
    settings: ModelSettings,
    options: Options,
    crystal: CrystalOptions,
) -> CrystalReport:
    cell = primitive_cell(contents.symbols, contents.positions_A, contents.cell_A, contents.sites)
    symbols = tuple(contents.symbols[atom] for atom in cell.kept)
    positions = contents.positions_A[cell.kept]
    units = (
        *(unit for network in contents.networks for unit in network.units),
        *(unit for molecule in contents.molecules for unit in molecule.units),
    )
    bonds = [_lattice_bond(unit, contents, cell) for unit in units]
    bonding = crystal_bonding(symbols, positions, cell.cell_A, bonds, table, settings, options, crystal)
    return CrystalReport(
        source=contents.source,
        title=contents.title,
        networks=tuple(f"{network.word} {network.reduced_formula}" for network in contents.networks),
        symbols=symbols,
        positions_A=positions,
        cell_A=cell.cell_A,
        labels=tuple(contents.labels[atom] for atom in cell.kept),
        sites=contents.sites[cell.kept],
        cell_ratio=cell.ratio,
        method=_method(table, settings, bonding),
        bonding=bonding,
        units=units,
        density=density_of_states(bonding.state),
        overlap_population=overlap_population_curves(bonding.state, bonding.orders),
        assumptions=_assumptions(contents, table, bonding, options, cell),
        warnings=_warnings(bonding, contents),
    )


def _lattice_bond(unit: MetalDonorUnit, contents: CrystalContents, cell: PrimitiveCell) -> LatticeBond:
    """Bond of the given cell in primitive vectors."""
    whole = np.array(unit.shift) @ contents.cell_A @ np.linalg.inv(cell.cell_A)
    shift = np.round(whole).astype(int) + cell.shift[unit.donor_atom] - cell.shift[unit.metal_atom]
    return LatticeBond(
        int(cell.place[unit.metal_atom]),
        int(cell.place[unit.donor_atom]),
        (int(shift[0]), int(shift[1]), int(shift[2])),
        str(unit.kind),
        unit.multiplicity // cell.ratio,
    )


def _method(table: ParameterTable, settings: ModelSettings, bonding: CrystalBonding) -> Method:
    sigma, pi, delta, _ = channel_constants(settings)
    state = bonding.state
    return Method(
        parameter_set=table.name,
        edition=table.edition,
        parameter_sha256=table.content_sha256,
        parameter_origin=table.origin,
        charge_model=state.charge_model,
        K=settings.K,
        K_sigma=sigma,
        K_pi=pi,
        K_delta=delta,
        weighting=settings.weighting,
        K_decay_per_A=settings.K_decay_per_A,
        lambda_=settings.lambda_,
        iterations=state.iterations,
        charge_residual=state.charge_residual,
        smearing_eV=state.filling.smearing_eV,
        smallest_overlap_eigenvalue=state.smallest_overlap_eigenvalue,
    )


def _assumptions(
    contents: CrystalContents, table: ParameterTable, bonding: CrystalBonding, options: Options, cell: PrimitiveCell
) -> tuple[str, ...]:
    said = list(contents.notes)
    if cell.ratio > 1:
        said.append(
            f"calculated in the primitive cell of {len(cell.kept)} atoms, of which the file's cell holds {cell.ratio}"
        )
    said.append("charge 0: a crystal is neutral" if options.charge is None else f"charge {options.charge:+d}: given")
    if bonding.electrons.unpaired is None:
        said.append("as many electrons of either spin: magnetic order is not looked for")
    else:
        said.append(f"{bonding.electrons.unpaired} unpaired electrons in the cell: given")
    if len(bonding.ions):
        ions: dict[str, int] = {}
        for ion in bonding.ions:
            symbol = contents.symbols[cell.kept[ion]]
            ions[symbol] = ions.get(symbol, 0) + 1
        acting = "act as point charges" if bonding.state.charge_model == "self-consistent" else "are left out"
        counted = ", ".join(f"{count} {symbol}" for symbol, count in ions.items())
        said.append(f"{counted} in the cell carry no functions and {acting}; their electrons are with the rest")
    if bonding.state.charge_model == "self-consistent":
        said.append(
            "energies count from the average electrostatic potential of the cell; beyond 6 Å softened charges act with "
            "the quadratic mean of their softness, without which the lattice sum has no limit"
        )
    if table.inherited:
        said.append(f"the table {table.name} does not state {', '.join(table.inherited)}: taken from the standard set")
    return tuple(said)


def _warnings(bonding: CrystalBonding, contents: CrystalContents) -> tuple[str, ...]:
    said = []
    smearing = bonding.state.filling.smearing_eV
    if bonding.gap is None:
        filled = f"filled by a Fermi-Dirac distribution of {smearing:g} eV" if smearing else "filled level by level"
        said.append(
            f"bands are partly filled: {filled}. Without electron repulsion, localised d or f electrons look metallic "
            "too"
        )
    elif smearing:
        said.append(f"the gap is below {SHARP_GAP_EV:g} eV: filled by a Fermi-Dirac distribution of {smearing:g} eV")
    change = bonding.mesh_change
    if change is not None and change.largest_order > ORDER_CHANGE:
        said.append(
            f"orders change by up to {change.largest_order:.3f} between the meshes: use a denser one with --mesh"
        )
    said += contents.missing_hydrogens
    return tuple(said)
