"""Readers on mutated and random text: an EhmoError or a fragment, never another exception."""

from __future__ import annotations

import contextlib

from hypothesis import HealthCheck, given, settings
from hypothesis import strategies as st

from ehmo.errors import EhmoError
from ehmo.structure import perceive, read_crystals, read_frames
from tests.structure.cif_text import INVERSION, cif, tetraoxo
from tests.structure.test_cif import CIF
from tests.structure.test_xyz import VOCL3

EXTENDED = VOCL3.replace("VOCl3", 'Lattice="9 0 0 0 9 0 0 0 9" Properties=species:S:1:pos:R:3')
PIECES = [
    "nan",
    "1e400",
    "-",
    "\x00",
    "\n",
    "\r",
    "?",
    ".",
    "loop_",
    "data_",
    "'",
    ";",
    "=",
    '"',
    "9" * 30,
    "V",
    "\u2028",
]


@st.composite
def mutated(draw, source: str) -> bytes:
    text = source
    for _ in range(draw(st.integers(1, 4))):
        start = draw(st.integers(0, len(text)))
        stop = min(len(text), start + draw(st.integers(0, 12)))
        insert = draw(st.sampled_from(PIECES) | st.text(max_size=4))
        text = text[:start] + insert + text[stop:]
    return text.encode("utf-8", "surrogatepass")


def _try(path, raw: bytes) -> None:
    path.write_bytes(raw)
    with contextlib.suppress(EhmoError):
        for fragment in read_frames(path, max_atoms=500):
            perceive(fragment)


relaxed = settings(
    max_examples=150, deadline=None, suppress_health_check=[HealthCheck.function_scoped_fixture], derandomize=True
)


@relaxed
@given(raw=mutated(VOCL3) | mutated(EXTENDED) | st.binary(max_size=200))
def test_xyz(tmp_path, raw):
    _try(tmp_path / "fuzz.xyz", raw)


@relaxed
@given(raw=mutated(CIF) | st.binary(max_size=200).map(b"data_x\n".__add__))
def test_cif(tmp_path, raw):
    _try(tmp_path / "fuzz.cif", raw)


DISORDERED = cif(
    [
        *(f"{line} 1 . ." for line in tetraoxo()),
        "O9 O 0.55 0.55 0.5 0.5 . -1",
        "K1 K 0.6 0.6 0.6 0.7 A 1",
        "K2 K 0.65 0.6 0.6 0.3 A 2",
        "OW O 0.4 0.6 0.7 0.4 . .",
    ],
    operations=INVERSION,
    columns="occupancy disorder_assembly disorder_group",
    extra="_chemical_formula_sum 'K Cr O5'",
)


@relaxed
@given(raw=mutated(DISORDERED), hydrogens=st.sampled_from(["file", "place", "lengthen"]), cations=st.booleans())
def test_disordered_crystal(tmp_path, raw, hydrogens, cations):
    path = tmp_path / "fuzz.cif"
    path.write_bytes(raw)
    with contextlib.suppress(EhmoError):
        read_crystals(path, hydrogens=hydrogens, cations="basis" if cations else "none", max_atoms=500)


@relaxed
@given(raw=st.binary(max_size=200))
def test_unknown_suffix(tmp_path, raw):
    _try(tmp_path / "fuzz.bin", raw)
