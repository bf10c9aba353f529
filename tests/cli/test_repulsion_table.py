"""Two-body terms of a parameter table: read, refused, written back, audited, hashed."""

import math

import pytest

import basis_params
from basis_params.audits import audit
from basis_params.reader import parse_table
from tests.cli.conftest import VOCL3

STANDARD = basis_params.load_set("standard")
LINE = "# repulsion O-V = 1200.5 eV, 3.2 per_A, 1.5 to 2.4 A, own-fit, table 1, page 3, derived"


def own(*lines):
    return parse_table("\n".join([*lines, basis_params.format_table(STANDARD)]), "own.csv", "own", base=STANDARD)


def test_a_term_is_read_whatever_the_order_of_its_elements():
    table = own(LINE)
    term = table.pair_repulsion("V", "O")
    assert term is table.pair_repulsion("O", "V")
    assert (term.label, term.amplitude_eV, term.decay_per_A) == ("V-O", 1200.5, 3.2)
    assert (term.source_key, term.locator, term.provenance) == ("own-fit", "table 1, page 3", "derived")
    assert term.energy_eV(1.6) == pytest.approx(1200.5 * math.exp(-3.2 * 1.6))  # law
    assert [term.covers(length) for length in (1.49, 1.5, 2.4, 2.41)] == [False, True, True, False]
    assert table.pair_repulsion("V", "V") is None
    assert not any("repulsion" in note for note in table.notes)


def test_writing_and_reading_back_keeps_the_content():
    table = own(LINE, "# repulsion H-O = -3 eV, 2 per_A, 0.8 to 1.2 A, own-fit, table 2, memory")
    again = parse_table(basis_params.format_table(table), "own.csv", "own")
    assert again == table
    assert dict(again.repulsion) == dict(table.repulsion)
    assert list(again.repulsion) == ["O-H", "V-O"]


def test_terms_are_part_of_the_content_hash():
    changed = own(LINE.replace("3.2 per_A", "3.3 per_A"))
    assert len({STANDARD.content_sha256, own(LINE).content_sha256, changed.content_sha256}) == 3
    assert own().content_sha256 == STANDARD.content_sha256


@pytest.mark.parametrize(
    ("line", "fault"),
    [
        ("# repulsion V-O = 3", "write # repulsion V-O = 1234.5 eV"),
        ("# repulsion V-Xx = 1 eV, 2 per_A, 1 to 2 A, a, b, read", "'Xx' is no element"),
        ("# repulsion V-O = nan eV, 2 per_A, 1 to 2 A, a, b, read", "finite number"),
        ("# repulsion V-O = 1e9 eV, 2 per_A, 1 to 2 A, a, b, read", "give an amplitude"),
        ("# repulsion V-O = 1 eV, -2 per_A, 1 to 2 A, a, b, read", "positive decay"),
        ("# repulsion V-O = 1 eV, 2 per_A, 2 to 1 A, a, b, read", "shorter length first"),
        ("# repulsion V-O = 1 eV, 2 per_A, 1 to 2 A, a, b, reed", "write read, memory, derived"),
        ("# repulsion V-O = 1 eV, 2 per_A, 1 to 2 A, =a, b, read", "spreadsheet formula"),
        ("# repulsion V-O = 1 eV, 2 per_A, 1 to 2 A, a, b\x1b[31m, read", "control characters"),
    ],
)
def test_faults_name_line_and_mend(line, fault):
    with pytest.raises(basis_params.ParameterFileError, match="line 1") as caught:
        own(line)
    assert fault in str(caught.value)
    assert str(caught.value).isprintable()


def test_a_pair_given_twice_is_a_fault():
    with pytest.raises(basis_params.ParameterFileError, match=r"line 2: the repulsion of V-O is given twice.*line 1"):
        own(LINE, LINE.replace("O-V", "V-O"))


def test_audit_holds_terms_against_radii_and_softness():
    rows = {row.check: row for row in audit(own(LINE)).rows if row.shell == "pair"}
    # Published: Cordero et al. 2008 (as in the atoms table): V 1.53, O 0.66 angstrom.
    assert rows["range"].reference == pytest.approx(1.53 + 0.66)
    assert {row.status for row in rows.values()} == {"ok"}
    slipped = own(LINE.replace("3.2 per_A", "0.32 per_A").replace("1.5 to 2.4", "15 to 18"))
    assert {row.status for row in audit(slipped).rows if row.shell == "pair"} == {"outlier"}


def test_show_lists_the_terms_of_the_chosen_elements(ehmo, put):
    put(VOCL3)
    put(basis_params.format_table(own(LINE)), "own.csv")
    whole = ehmo("params", "show", "own.csv", "V", "O")
    assert "Two-body repulsion" in whole.out
    assert "1200.5" in whole.out
    assert "own-fit" in whole.out
    assert "Two-body" not in ehmo("params", "show", "own.csv", "V").out
    assert "range" in ehmo("params", "check", "own.csv").out
