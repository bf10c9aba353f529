"""Columns of the store, declared once: tables, exports and README are made from these.

Structures have the columns of `PROVENANCE_COLUMNS` and `STRUCTURE_COLUMNS`, bonds those of `BOND_COLUMNS`. A column is
taken from the full document by its `value`, so that one added later is filled from stored documents.
"""

from __future__ import annotations

import math
from collections.abc import Callable, Mapping, Sequence
from dataclasses import dataclass
from typing import Any, Literal

Document = Mapping[str, Any]
Kind = Literal["text", "integer", "real"]
Cell = str | int | float | None


@dataclass(frozen=True, slots=True)
class Column:
    """One column.

    Attributes
    ----------
    name : str
        Its name in the database, in exports and in conditions; ends with the unit if there is one.
    kind : "text", "integer" or "real"
    unit : str
        Unit; empty for text and pure numbers.
    meaning : str
        In words.
    value : callable
        Value from the document (structures), or from the document and one of its bonds (bonds).
    """

    name: str
    kind: Kind
    unit: str
    meaning: str
    value: Callable[..., Any]

    def cell(self, *parts: Document) -> Cell:
        """Value of this column as its kind; what does not exist, or is not of that kind, is None."""
        value = self.value(*parts)
        if value is None or isinstance(value, (list, dict)):
            return None
        if self.kind == "text":
            return str(value)
        if isinstance(value, str) or not math.isfinite(value):
            return None
        return int(value) if self.kind == "integer" else float(value)


def _at(*path: str) -> Callable[[Document], Any]:
    """Look up of a field by its path; None where a part is missing."""

    def value(document: Document) -> Any:
        found: Any = document
        for name in path:
            found = found.get(name) if isinstance(found, Mapping) else None
        return found

    return value


def _of_bond(name: str) -> Callable[[Document, Document], Any]:
    return lambda _, bond: bond.get(name)


def _count(name: str) -> Callable[[Document], int]:
    return lambda document: len(document.get(name) or ())


def listed_atoms(document: Document) -> Sequence[Document]:
    """Atoms with their symbols: those of the fragment, or of the crystal."""
    atoms: Sequence[Document] = _at("fragment", "atoms")(document) or document.get("atoms") or ()
    return atoms


def cell_vectors(document: Document) -> Sequence[Sequence[float]] | None:
    """Cell of a crystal, one vector per row [angstrom]; None for a molecule."""
    cell: Sequence[Sequence[float]] | None = _at("crystal", "cell_A")(document)
    return cell


def _symbol(end: str) -> Callable[[Document, Document], Any]:
    return lambda document, bond: listed_atoms(document)[bond[end]].get("symbol")


def _metals(document: Document) -> str:
    """Symbols of the metals that have bonds, each atom once."""
    atoms = listed_atoms(document)
    places = sorted({bond["metal"] for bond in document.get("bonds") or ()})
    return " ".join(str(atoms[place].get("symbol")) for place in places)


def _weight(symmetry: str, rank: int) -> Callable[[Document, Document], Any]:
    """Weight of a channel of that symmetry; 0 if the bond has none, since reports list none below 0.001."""

    def value(_: Document, bond: Document) -> float:
        weights = sorted((part["weight"] for part in bond["channels"] if part["type"] == symmetry), reverse=True)
        return weights[rank] if len(weights) > rank else 0.0

    return value


def _of_atom(end: str, name: str) -> Callable[[Document, Document], Any]:
    return lambda document, bond: document["atoms"][bond[end]].get(name)


def _first_band(kinds: tuple[str, ...]) -> Callable[[Document], Any]:
    def value(document: Document) -> Any:
        bands = document.get("bands") or ()
        return min((band["wavenumber_per_cm"] for band in bands if band["kind"] in kinds), default=None)

    return value


def _sphere_groups(document: Document) -> str | None:
    spheres = _at("symmetry", "spheres")(document) or ()
    return " ".join(str(sphere.get("point_group")) for sphere in spheres) or None


def _gap(document: Document) -> Any:
    gap = _at("health", "frontier_gap_eV")(document)
    return _at("gap", "gap_eV")(document) if gap is None else gap


def _leaning(_: Document, bond: Document) -> Any:
    return _at("reactivity", "leaning")(bond)


def _mayer_sd(_: Document, bond: Document) -> Any:
    return _at("spread", "mayer")(bond)


def _stored(name: str, kind: Kind, unit: str, meaning: str) -> Column:
    """Column whose value comes with the row, not out of the document."""
    return Column(name, kind, unit, meaning, lambda: None)


PROVENANCE_COLUMNS = (
    _stored("key", "text", "", "SHA-256 of everything that can change a number"),
    _stored("status", "text", "", "done or failed"),
    _stored("message", "text", "", "why it failed"),
    _stored("source", "text", "", "path or name of the structure, as given"),
    _stored("entry", "text", "", "frame, block or molecule within the source"),
    _stored("tags", "text", "", "words put on the structure, as a JSON list"),
    _stored("program_version", "text", "", "version of ehmo"),
    _stored("document_schema", "text", "", "name and version of the full record"),
    _stored("results_edition", "integer", "", "rises whenever numbers change"),
    _stored("parameter_set", "text", "", "parameter set"),
    _stored("parameter_sha256", "text", "", "hash of its content"),
    _stored("platform", "text", "", "system, processor, Python, numpy"),
    _stored("started_utc", "text", "", "start of the calculation"),
    _stored("duration_s", "real", "s", "time it took"),
)

STRUCTURE_COLUMNS = (
    Column("formula", "text", "", "formula", lambda d: _at("fragment", "formula")(d) or _at("crystal", "formula")(d)),
    Column("metals", "text", "", "symbols of the metals", _metals),
    Column("atoms", "integer", "", "number of atoms", lambda d: len(listed_atoms(d))),
    Column("charge", "integer", "e", "total charge", _at("fragment", "charge")),
    Column("unpaired_electrons", "integer", "", "unpaired electrons", _at("fragment", "unpaired_electrons")),
    Column("oxidation_state", "integer", "", "of a single metal, by counting", _at("oxidation_state")),
    Column("d_count", "integer", "", "d electrons by counting", _at("d_count")),
    Column("point_group", "text", "", "of the whole molecule", _at("symmetry", "molecule", "point_group")),
    Column("sphere_point_group", "text", "", "of each coordination sphere, idealised", _sphere_groups),
    Column("ground_term", "text", "", "ground term", _at("ground_term")),
    Column("first_band_per_cm", "real", "1/cm", "lowest d-d or f-f band", _first_band(("d-d", "f-f"))),
    Column(
        "first_charge_transfer_per_cm", "real", "1/cm", "lowest charge-transfer band", _first_band(("charge transfer",))
    ),
    Column("energy_eV", "real", "eV", "electronic energy, of no use for lengths", _at("method", "energy_eV")),
    Column("gap_eV", "real", "eV", "gap of the frontier orbitals, or of the bands", _gap),
    Column("charge_model", "text", "", "fixed or self-consistent charges", _at("method", "charge_model")),
    Column("iterations", "integer", "", "iterations of the charges", _at("method", "iterations")),
    Column("bonds", "integer", "", "metal-donor bonds", _count("bonds")),
    Column("warnings", "integer", "", "number of things to doubt", _count("warnings")),
)

BOND_COLUMNS = (
    Column("bond", "text", "", "label of the bond", _of_bond("label")),
    Column("metal", "text", "", "symbol of the metal", _symbol("metal")),
    Column("donor", "text", "", "symbol of the donor atom", _symbol("donor")),
    Column("kind", "text", "", "kind of donor", _of_bond("kind")),
    Column("length_A", "real", "Å", "length", _of_bond("length_A")),
    Column("bond_valence", "real", "", "bond valence", _of_bond("bond_valence")),
    Column("overlap_population", "real", "e", "Mulliken overlap population", _of_bond("overlap_population")),
    Column("mayer", "real", "", "Mayer bond order", _of_bond("mayer")),
    Column("wiberg", "real", "", "Wiberg bond order", _of_bond("wiberg")),
    Column("formal_order", "real", "", "bond order by textbook counting", _of_bond("formal_order")),
    Column("formal_order_words", "text", "", "the same in words", _of_bond("formal_order_words")),
    Column("sigma_weight", "real", "", "weight of the largest sigma channel", _weight("sigma", 0)),
    Column("pi_weight_1", "real", "", "weight of the largest pi channel", _weight("pi", 0)),
    Column("pi_weight_2", "real", "", "weight of the second pi channel", _weight("pi", 1)),
    Column("delta_weight", "real", "", "weight of the largest delta channel", _weight("delta", 0)),
    Column("metal_charge", "real", "e", "Mulliken charge of the metal", _of_atom("metal", "mulliken_charge")),
    Column("donor_charge", "real", "e", "Mulliken charge of the donor", _of_atom("donor", "mulliken_charge")),
    Column("metal_spin", "real", "", "alpha minus beta population of the metal", _of_atom("metal", "spin_population")),
    Column("leaning", "text", "", "nucleophilic to electrophilic, of a multiply bonded donor", _leaning),
    Column("mayer_sd", "real", "", "standard deviation of the Mayer order, where draws were made", _mayer_sd),
)

CONTEXT_COLUMNS = tuple(
    column
    for column in (*PROVENANCE_COLUMNS, *STRUCTURE_COLUMNS)
    if column.name
    in {"key", "source", "entry", "tags", "formula", "charge", "unpaired_electrons", "oxidation_state", "d_count"}
)
"""Columns of the structure that come before those of each of its bonds in a table."""

TABLES: dict[str, tuple[Column, ...]] = {
    "structures": (*PROVENANCE_COLUMNS, *STRUCTURE_COLUMNS),
    "bonds": (*CONTEXT_COLUMNS, *BOND_COLUMNS),
}
"""Tables that leave the store, one row per structure and one per bond."""
