"""Structures of a training set, prepared once and calculated again for every set of parameters."""

from __future__ import annotations

from collections.abc import Mapping, Sequence
from dataclasses import dataclass

import numpy as np

from basis_params import ParameterTable
from ehmo.calculate import effective_settings
from ehmo.calculate.report import brief_report
from ehmo.calculate.sites import sphere_symmetries
from ehmo.errors import EhmoError, InputError
from ehmo.records.arrays import FloatArray
from ehmo.records.bands import Band
from ehmo.records.calibration import MECHANICAL, CalibrationSpec, Observable
from ehmo.records.coordination import Coordination, ElectronAssignment
from ehmo.records.fragment import Fragment
from ehmo.records.options import Options
from ehmo.records.report import BondReport
from ehmo.records.symmetry import Symmetry
from ehmo.structure import assign_electrons, perceive, read_frames
from ehmo.studies.calibration.modes import kind_and_phase

ALLOWED_STRENGTH = 1e-3
"""Oscillator strength from which a charge-transfer band counts as allowed."""


@dataclass(frozen=True, slots=True, eq=False)
class TrainingStructure:
    """One geometry with all that its parameters leave alone.

    Attributes
    ----------
    fragment : Fragment
        With charge and spin.
    coordination : Coordination
    electrons : ElectronAssignment
    symmetries : tuple of Symmetry
        Of the spheres.
    elements : frozenset of str
    """

    fragment: Fragment
    coordination: Coordination
    electrons: ElectronAssignment
    symmetries: tuple[Symmetry, ...]
    elements: frozenset[str]

    @property
    def metals(self) -> frozenset[str]:
        """Elements of the metals."""
        return frozenset(self.fragment.symbols[metal] for metal in self.coordination.metals)

    def report(self, table: ParameterTable, *, charge_transfer: bool = True) -> BondReport:
        """Orders, charges, ladder and bands with one set of parameters; see `brief_report`."""
        options = Options()
        part = ParameterTable(
            table.name, table.edition, table.settings, {symbol: table.elements[symbol] for symbol in self.elements}
        )
        return brief_report(
            self.fragment,
            self.coordination,
            self.electrons,
            part,
            effective_settings(part.settings, options),
            options,
            self.symmetries,
            charge_transfer=charge_transfer,
        )

    def values(self, table: ParameterTable, observables: Sequence[Observable]) -> FloatArray:
        """Observables of this structure; NaN for one that the parameters do not give.

        Parameters
        ----------
        table : ParameterTable
        observables : sequence of Observable
            None of those that need an energy.

        Returns
        -------
        values : (n_observables,) ndarray
            In the units of the observables.
        """
        try:
            transfer = any(observable.quantity == "charge-transfer band" for observable in observables)
            report = self.report(table, charge_transfer=transfer)
        except EhmoError:
            return np.full(len(observables), np.nan)
        return np.array([observed(report, observable) for observable in observables], dtype=float)


def training_structures(spec: CalibrationSpec, table: ParameterTable) -> dict[str, TrainingStructure]:
    """Structures that the observables of a specification name.

    Parameters
    ----------
    spec : CalibrationSpec
    table : ParameterTable
        Base set, which must have their elements.

    Returns
    -------
    structures : dict of str to TrainingStructure
        By title.

    Raises
    ------
    EhmoError
        If a structure is missing or cannot be calculated with the base set, or an observable names a bond or an atom
        that is not there.
    """
    frames: dict[str, Fragment] = {}
    for path in spec.structure_files:
        for frame in read_frames(path):
            if frame.title in frames:
                raise InputError(f"two frames are called {frame.title!r}", place=path, mend="rename one")
            frames[frame.title] = frame
    found: dict[str, TrainingStructure] = {}
    for observable in spec.observables:
        name = observable.structure
        if name not in frames:
            raise InputError(
                f"line {observable.line} of the observables names the structure {name!r}, which no file holds",
                place=spec.place,
                mend="add a frame with that title",
            )
        if name not in found:
            found[name] = _structure(frames[name], spec.oxidation_states.get(name))
        _check(observable, found[name], spec.place)
    for name in spec.oxidation_states:
        if name not in found:
            raise InputError(
                f"oxidation_states.{name}: no observable names this structure", place=spec.place, mend="leave it out"
            )
    for structure in found.values():
        structure.report(table)
    return found


def _structure(fragment: Fragment, oxidation_state: int | None) -> TrainingStructure:
    coordination = perceive(fragment)
    electrons = assign_electrons(fragment, coordination, None, None, oxidation_state)
    if electrons.spin_candidates:
        raise InputError("the unpaired electrons are open", place=fragment.source, mend="write unpaired=N beside it")
    fragment = fragment.with_electrons(electrons.charge, electrons.unpaired_electrons)
    return TrainingStructure(
        fragment,
        coordination,
        electrons,
        sphere_symmetries(fragment, coordination),
        frozenset(fragment.symbols),
    )


def _check(observable: Observable, structure: TrainingStructure, place: str) -> None:
    """Refuse an observable of a bond, an atom or a kind of donor that the structure has not."""
    fragment, bonds = structure.fragment, structure.coordination.bonds
    labels = {f"{fragment.labels[bond.metal]}-{fragment.labels[bond.donor]}" for bond in bonds}
    known: Mapping[str, set[str]] = {
        "Mayer order": labels,
        "charge": set(fragment.labels),
        "length": labels | {bond.kind.value for bond in bonds},
        "stretching wavenumber": {bond.kind.value for bond in bonds},
    }
    of, _ = kind_and_phase(observable.of)
    if observable.quantity in known and of not in known[observable.quantity]:
        raise InputError(
            f"line {observable.line} of the observables: {observable.structure} has no {of!r}",
            place=place,
            mend=f"choose from {', '.join(sorted(known[observable.quantity]))}",
        )


def observed(report: BondReport, observable: Observable) -> float:
    """One observable as a report has it; NaN where it has none.

    Parameters
    ----------
    report : BondReport
    observable : Observable
        Of a quantity that needs no energy.

    Returns
    -------
    value : float
    """
    assert observable.quantity not in MECHANICAL
    if observable.quantity == "Mayer order":
        orders = {report.bond_label(bond): order.mayer for bond, order in report.bonds()}
        return orders[observable.of]
    if observable.quantity == "charge":
        return float(report.populations.charges[report.fragment.labels.index(observable.of)])
    if observable.quantity == "10Dq":
        parameters = report.sites[0].parameters
        return np.nan if parameters is None else parameters.crystal_field_per_cm.get("10Dq", np.nan)
    if observable.quantity == "d-d band":
        return _band_within_the_shell(report.spectroscopy.bands, observable.of)
    return _charge_transfer(report.spectroscopy.bands, observable.of)


def _band_within_the_shell(bands: Sequence[Band], of: str) -> float:
    term, _, place = of.partition(" ")
    same = [band.wavenumber_per_cm for band in bands if band.kind != "charge transfer" and band.upper_term == term]
    count = int(place or 1)
    return same[count - 1] if len(same) >= count else np.nan


def _charge_transfer(bands: Sequence[Band], of: str) -> float:
    """Lowest band that is asked for: of any kind, of an allowed one, or the lowest allowed one between two irreps."""
    found = [band for band in bands if band.kind == "charge transfer"]
    if of != "lowest":
        found = [band for band in found if (band.oscillator_strength or 0.0) >= ALLOWED_STRENGTH]
    if not of.startswith("lowest"):
        lower, upper = of.split(" to ")
        found = [band for band in found if _irreps(band) == (lower, upper)]
    return min((band.wavenumber_per_cm for band in found), default=np.nan)


def _irreps(band: Band) -> tuple[str, str]:
    """Irreps of the two orbitals, from words such as ``14 t1 to 17 e``."""
    left, _, right = band.transition.partition(" to ")
    return left.split()[-1], right.split()[-1]
