"""From a work item to rows: reading, calculating and packing, in whichever process the item has come to."""

from __future__ import annotations

import platform
import time
from collections.abc import Iterator, Sequence
from dataclasses import dataclass, replace
from datetime import UTC, datetime
from pathlib import Path
from typing import Any, NamedTuple, cast

from basis_params import ParameterTable
from ehmo import __version__
from ehmo.batch.items import BatchSettings, WorkItem
from ehmo.batch.keys import RESULTS_EDITION, crystal_key, molecule_key, unread_key
from ehmo.batch.known import KnownKeys
from ehmo.errors import EhmoError, InputError, visible
from ehmo.records.crystal import CrystalContents
from ehmo.records.fragment import Fragment
from ehmo.records.options import Options
from ehmo.report.bands_document import SCHEMA as CRYSTAL_SCHEMA
from ehmo.report.document import SCHEMA as BOND_SCHEMA
from ehmo.store import DONE, FAILED, PackedRow, Provenance, StoredRow, pack
from ehmo.structure.contents import Cations, Hydrogens
from ehmo.structure.files import decoded, shown

Structure = Fragment | CrystalContents


class Contents(NamedTuple):
    """What an item holds: structures, and words that their source puts on them."""

    structures: Sequence[Structure]
    tags: tuple[str, ...] = ()


LONGEST_MESSAGE = 2000


@dataclass(frozen=True, slots=True)
class Begun:
    """A structure whose calculation starts now: its key, and the entry of the source that it is."""

    key: str
    entry: str


@dataclass(frozen=True, slots=True)
class Skipped:
    """A structure that has its row already."""

    key: str


@dataclass(frozen=True, slots=True)
class Finished:
    """A row, the reason of a failure in general words, and seconds: reading, calculating, making the full record."""

    row: PackedRow
    reason: str = ""
    read_s: float = 0.0
    calculate_s: float = 0.0
    record_s: float = 0.0


Outcome = Begun | Skipped | Finished


class Workplace:
    """Turns items into rows.

    Parameters
    ----------
    settings : BatchSettings
    known : KnownKeys, optional
        Structures that have their rows already.

    Raises
    ------
    EhmoError
        If the parameter set cannot be used.
    """

    def __init__(self, settings: BatchSettings, known: KnownKeys | None = None) -> None:
        self._table: ParameterTable = settings.table()
        self._settings = replace(settings, parameter_sha256=self._table.content_sha256)
        self._known = known or KnownKeys()

    def outcomes(self, item: WorkItem) -> Iterator[Outcome]:
        """What becomes of each structure of an item; errors become failed rows.

        Yields
        ------
        outcome : Begun, Skipped or Finished
        """
        unread = unread_key(item, self._settings)
        if self._has(unread, item):
            yield Skipped(unread)
            return
        clock = _Clock()
        try:
            structures, tags = read_structures(item, self._settings)
        except Exception as fault:  # noqa: BLE001  one bad file must not end the run: its row says what is wrong
            yield self._failure(unread, item, item.entry, fault, clock, _Clock())
            return
        read = clock.stopped()
        item = replace(item, tags=(*item.tags, *tags))
        for structure in structures:
            yield from self._structure(structure, item, read)
            read = clock.at_rest()

    def failed(self, item: WorkItem, key: str | None, entry: str, message: str, duration_s: float) -> Finished:
        """Row of a structure whose process was ended from outside.

        Parameters
        ----------
        item : WorkItem
        key : str or None
            None if it was still being read.
        entry : str
        message : str
            What happened, and after a semicolon the mend.
        duration_s : float

        Returns
        -------
        outcome : Finished
        """
        clock = _Clock(duration_s)
        words, _, mend = message.partition("; ")
        fault = InputError(words, place=shown(item.place, 200), mend=mend)
        return self._failure(key or unread_key(item, self._settings), item, entry, fault, _Clock(0.0), clock)

    def _has(self, key: str, item: WorkItem) -> bool:
        return key in item.left_out or key in self._known

    def _structure(self, structure: Structure, item: WorkItem, read: _Clock) -> Iterator[Outcome]:
        entry = _entry(structure, item)
        options = item_options(item, self._settings.options)
        clock = _Clock()
        try:
            key = _key(structure, self._settings, options)
        except Exception as fault:  # noqa: BLE001  as above
            yield self._failure(unread_key(item, self._settings), item, entry, fault, read, clock)
            return
        if self._has(key, item):
            yield Skipped(key)
            return
        yield Begun(key, entry)
        clock = _Clock()
        try:
            report = _report(structure, self._table, self._settings, options)
            calculated = clock.stopped()
            clock = _Clock()
            document = _document(report)
        except Exception as fault:  # noqa: BLE001  as above
            yield self._failure(key, item, entry, fault, read, clock.stopped())
            return
        recorded = clock.stopped()
        row = StoredRow(key, DONE, "", document, self._provenance(item, entry, structure, read, calculated))
        yield Finished(pack(row), "", read.seconds, calculated.seconds, recorded.seconds)

    def _failure(
        self, key: str, item: WorkItem, entry: str, fault: Exception, read: _Clock, calculated: _Clock
    ) -> Finished:
        message, reason = _words(fault, item)
        provenance = self._provenance(item, entry, None, read, calculated)
        row = StoredRow(key, FAILED, message[:LONGEST_MESSAGE], None, provenance)
        return Finished(pack(row), reason[:LONGEST_MESSAGE], read.stopped().seconds, calculated.stopped().seconds)

    def _provenance(
        self, item: WorkItem, entry: str, structure: Structure | None, read: _Clock, calculated: _Clock
    ) -> Provenance:
        return Provenance(
            source=item.source,
            entry=entry,
            tags=item.tags,
            program_version=__version__,
            document_schema=CRYSTAL_SCHEMA if isinstance(structure, CrystalContents) else BOND_SCHEMA,
            results_edition=RESULTS_EDITION,
            parameter_set=self._table.name,
            parameter_sha256=self._table.content_sha256,
            platform=platform_words(),
            started_utc=calculated.started_utc,
            duration_s=read.stopped().seconds + calculated.stopped().seconds,
        )


class _Clock:
    """Seconds since it was made, until it is stopped."""

    def __init__(self, seconds: float | None = None) -> None:
        self._start = time.perf_counter()
        now = datetime.now(UTC).timestamp() - (seconds or 0.0)
        self.started_utc = datetime.fromtimestamp(now, UTC).isoformat(timespec="milliseconds").replace("+00:00", "Z")
        self._seconds = seconds

    @property
    def seconds(self) -> float:
        return time.perf_counter() - self._start if self._seconds is None else self._seconds

    def stopped(self) -> _Clock:
        self._seconds = self.seconds
        return self

    @staticmethod
    def at_rest() -> _Clock:
        return _Clock(0.0)


def read_structures(item: WorkItem, settings: BatchSettings) -> Contents:
    """Structures of an item: molecules, or a crystal whose metals are in chains, layers or frameworks.

    Raises
    ------
    EhmoError
        If it cannot be read, or charge or spin is given for several molecules.
    """
    place = shown(item.place, 200)
    if item.kind == "fault":
        words, _, mend = item.text.partition("\n")
        raise InputError(words, place=place, mend=mend)
    if item.kind == "row":
        return _database_row(item, settings)
    if item.kind == "xyz":
        return Contents(_frames(item, settings))
    crystals = _crystals(item, settings, place)
    if crystals is None:
        from ehmo.structure import read_frames

        hydrogens = cast(Hydrogens, settings.hydrogens)
        return Contents(
            read_frames(item.source, hydrogens=hydrogens, max_atoms=settings.max_atoms, max_bytes=settings.max_bytes)
        )
    molecules = [fragment for contents in crystals for fragment in _molecules(contents)]
    _refuse_one_charge_for_several(molecules, item, settings, place)
    return Contents(molecules or crystals)


def _refuse_one_charge_for_several(
    molecules: Sequence[Fragment], item: WorkItem, settings: BatchSettings, place: str
) -> None:
    options = item_options(item, settings.options)
    given = (options.charge, options.unpaired_electrons, options.oxidation_state)
    if len(molecules) > 1 and any(value is not None for value in given):
        raise InputError(
            f"charge or spin is given, and there are {len(molecules)} molecules with metals",
            place=place,
            mend="leave it out, or give the molecules as XYZ",
        )


def _database_row(item: WorkItem, settings: BatchSettings) -> Contents:
    from ehmo.structure import ase_database_row
    from ehmo.structure.readers import completed

    row = ase_database_row(Path(item.source), item.number, max_atoms=settings.max_atoms)
    place = shown(item.place, 200)
    if row.fault:
        raise InputError(row.fault.removeprefix(f"{place}: "), place=place)
    _refuse_one_charge_for_several(row.fragments, item, settings, place)
    if row.fragments:
        return Contents(completed(row.fragments, cast(Hydrogens, settings.hydrogens)), row.tags)
    return Contents(() if row.contents is None else (row.contents,), row.tags)


def _frames(item: WorkItem, settings: BatchSettings) -> Sequence[Fragment]:
    from ehmo.structure.readers import frames_of_text

    return frames_of_text(
        decoded(item.text.encode("latin-1"), shown(item.place, 200)),
        shown(item.source, 200),
        hydrogens=cast(Hydrogens, settings.hydrogens),
        max_atoms=settings.max_atoms,
        first_line=item.first_line,
        first_number=item.number,
    )


def _crystals(item: WorkItem, settings: BatchSettings, place: str) -> Sequence[CrystalContents] | None:
    """Crystals of a data block or a file; None if the file is no CIF."""
    from ehmo.structure import is_crystal, read_crystals
    from ehmo.structure.crystal import crystals_of_text

    hydrogens, cations = cast(Hydrogens, settings.hydrogens), cast(Cations, settings.cations)
    if item.kind == "cif":
        # Blank lines in place of what comes before, so that messages name the line of the file.
        text = "\n" * (item.first_line - 1) + decoded(item.text.encode("latin-1"), place)
        return crystals_of_text(text, place, settings.max_atoms, hydrogens=hydrogens, cations=cations)
    if not is_crystal(item.source, max_bytes=settings.max_bytes):
        return None
    return read_crystals(
        Path(item.source),
        hydrogens=hydrogens,
        cations=cations,
        max_atoms=settings.max_atoms,
        max_bytes=settings.max_bytes,
    )


def _molecules(contents: CrystalContents) -> Sequence[Fragment]:
    from ehmo.structure.crystal import molecules_of

    return molecules_of(contents) if contents.molecules else ()


def item_options(item: WorkItem, options: Options) -> Options:
    """Options with the charge and spin of the item, where it states them."""
    if item.charge is None and item.unpaired_electrons is None:
        return options
    return replace(
        options,
        charge=options.charge if item.charge is None else item.charge,
        unpaired_electrons=(options.unpaired_electrons if item.unpaired_electrons is None else item.unpaired_electrons),
    )


def _entry(structure: Structure, item: WorkItem) -> str:
    """Place of the structure within its file."""
    within = structure.source.removeprefix(shown(item.source, 200)).lstrip(", ")
    return within or item.entry


def _key(structure: Structure, settings: BatchSettings, options: Options) -> str:
    if isinstance(structure, CrystalContents):
        return crystal_key(structure, settings, options)
    return molecule_key(structure, settings, options)


def _report(structure: Structure, table: ParameterTable, settings: BatchSettings, options: Options) -> Any:
    if isinstance(structure, CrystalContents):
        from ehmo.calculate.crystal import CrystalOptions
        from ehmo.calculate.crystal_report import crystal_report

        crystal = CrystalOptions(mesh=settings.mesh, cations_basis=settings.cations == "basis")
        return crystal_report(structure, table, options, crystal)
    if settings.draws:
        from ehmo.studies.spread import spread_report

        return spread_report(structure, table, options, draws=settings.draws)
    from ehmo.calculate import bond_report

    return bond_report(structure, table, options)


def _document(report: Any) -> dict[str, Any]:
    from ehmo.records.crystal_report import CrystalReport

    if isinstance(report, CrystalReport):
        from ehmo.report.bands_document import crystal_document

        return crystal_document(report)
    from ehmo.report.document import bond_document

    return bond_document(report)


def _words(fault: Exception, item: WorkItem) -> tuple[str, str]:
    """Message of a failed row, and the reason without place and mend."""
    if isinstance(fault, EhmoError):
        return str(fault), visible(fault.fault)
    if isinstance(fault, MemoryError):
        reason = "not enough memory within the limit"
        return f"{shown(item.place, 200)}: {reason}; raise --memory-limit or use fewer workers", reason
    reason = f"unexpected {type(fault).__name__}: {shown(fault, 300)}"
    return f"{shown(item.place, 200)}: {reason}; please report it with the structure", reason


def platform_words() -> str:
    """System, processor and versions that numbers may depend on."""
    import numpy as np

    return f"{platform.system()} {platform.machine()}, Python {platform.python_version()}, numpy {np.__version__}"
