"""What travels to where the work is done: items and the settings that all of them share, as plain data."""

from __future__ import annotations

from collections.abc import Mapping
from dataclasses import asdict, dataclass, field, fields, replace
from pathlib import Path
from typing import Any, Literal

from basis_params import ParameterTable
from basis_params.faults import read_text
from basis_params.reader import parse_table
from ehmo.errors import InputError
from ehmo.orbitals.parameters import load_parameters
from ehmo.records.options import Options

Kind = Literal["xyz", "cif", "file", "row", "fault"]


@dataclass(frozen=True, slots=True)
class WorkItem:
    """One piece of a source: a frame, a data block, or a whole file.

    Attributes
    ----------
    source : str
        File as it was given.
    entry : str
        Frame or block within it; empty if there is one.
    kind : "xyz", "cif", "file", "row" or "fault"
        Text of frames, text of a data block, a file or a row of an ASE database to read where the work is done, or a
        source that cannot be used.
    text : str
        Bytes of the piece, one character each; size and time of a file to read; or why the source cannot be used.
    first_line, number : int
        Line and frame of the file that the text starts with; row of a database.
    charge, unpaired_electrons : int or None
        As a manifest states them.
    tags : tuple of str
    size : int
        Bytes of the source that it stands for, for the progress display.
    left_out : tuple of str
        Keys of structures of this item that have their rows already.
    """

    source: str
    entry: str = ""
    kind: Kind = "file"
    text: str = ""
    first_line: int = 1
    number: int = 1
    charge: int | None = None
    unpaired_electrons: int | None = None
    tags: tuple[str, ...] = ()
    size: int = 0
    left_out: tuple[str, ...] = ()

    @property
    def place(self) -> str:
        """Source and entry, as messages name them."""
        return f"{self.source}, {self.entry}" if self.entry else self.source


@dataclass(frozen=True, slots=True)
class BatchSettings:
    """Settings of a whole batch.

    Attributes
    ----------
    options : Options
        Charge and spin of an item's own go before those.
    parameters : str
        Name of a shipped set, or path of a table.
    parameter_text : str
        Text of that table, so that it need not be readable where the work is done; empty for a shipped set.
    parameter_sha256 : str
        Hash of its content.
    hydrogens, cations : str
        As for `ehmo.structure.read_frames`.
    mesh : tuple of int or None
        k-points for extended structures; None for those that the cell calls for.
    draws : int
        Draws of the parameters for standard deviations; 0 for none.
    max_atoms, max_bytes : int
        Limits of one item.
    """

    options: Options = field(default_factory=Options)
    parameters: str = "standard"
    parameter_text: str = ""
    parameter_sha256: str = ""
    hydrogens: str = "file"
    cations: str = "none"
    mesh: tuple[int, int, int] | None = None
    draws: int = 0
    max_atoms: int = 10_000
    max_bytes: int = 100_000_000

    def plain(self) -> dict[str, Any]:
        """The same as plain data."""
        return asdict(self)

    def table(self) -> ParameterTable:
        """Parameter set.

        Raises
        ------
        ParameterError
            If it cannot be used.
        InputError
            If it is another one than that the batch was started with.
        """
        if self.parameter_text:
            table = parse_table(
                self.parameter_text, self.parameters, Path(self.parameters).stem, base=load_parameters("standard")
            )
        else:
            table = load_parameters(self.parameters)
        if self.parameter_sha256 and table.content_sha256 != self.parameter_sha256:
            raise InputError(
                "the parameter set is not the one that the batch was started with",
                place=self.parameters,
                mend="install the same version of the program everywhere",
            )
        return table


def with_parameters(settings: BatchSettings, name_or_path: str) -> BatchSettings:
    """Settings with a parameter set, its text and its hash.

    Raises
    ------
    ParameterError
        If it cannot be used.
    """
    table = load_parameters(name_or_path)
    text = "" if table.origin == "built in" else read_text(Path(name_or_path))
    return replace(settings, parameters=name_or_path, parameter_text=text, parameter_sha256=table.content_sha256)


def plain_item(item: WorkItem) -> dict[str, Any]:
    """Item as plain data; what has its usual value is left out."""
    values = {one.name: (getattr(item, one.name), one.default) for one in fields(WorkItem)}
    return {name: value for name, (value, usual) in values.items() if value != usual}


def item_of(data: Mapping[str, Any]) -> WorkItem:
    """Item of its plain data."""
    return WorkItem(**{**data, "tags": tuple(data.get("tags", ())), "left_out": tuple(data.get("left_out", ()))})


def settings_of(data: Mapping[str, Any]) -> BatchSettings:
    """Settings of their plain data."""
    options = dict(data["options"])
    for name in ("observed_bands_per_cm", "observed_terms"):
        options[name] = tuple(options[name])
    mesh = data["mesh"]
    return BatchSettings(
        **{**data, "options": Options(**options), "mesh": None if mesh is None else (mesh[0], mesh[1], mesh[2])}
    )
