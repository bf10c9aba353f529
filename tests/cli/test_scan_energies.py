"""``ehmo scan`` with a set that is calibrated for the bond: energies, isotopes, relaxation, refusals."""

import pytest

import basis_params
from tests.cli.conftest import VOCL3
from tests.energy.fragments import with_terms

# Invented terms, for these tests only.
TABLE = with_terms(("V", "O", 2500.0, 4.2, 1.45, 2.0))


def test_command_line(ehmo, put, tmp_path):
    put(VOCL3)
    put(basis_params.format_table(TABLE), "own.csv")
    ran = ehmo(
        *("scan", "a.xyz", "--bond", "V1-O2", "--from", "1.6", "--to", "1.8", "--steps", "7"),
        *("--params", "own.csv", "--isotopes", "O2=18,V=51", "--json", "s.json", "--csv", "s.csv"),
    )
    assert (ran.status, ran.err) == (0, "")
    assert "isotopes O2=18, V=51" in ran.out
    assert "energy_eV" in (tmp_path / "s.csv").read_text()


@pytest.mark.parametrize(
    ("words", "fault"),
    [
        (("--isotopes", "O2"), "names no isotope"),
        (("--isotopes", "O2=18,O2=17"), "twice"),
        (("--isotopes", "O9=18"), "no atom O9"),
        (("--isotopes", "O2=99"), "no nuclide"),
        (("--relax",), "no two-body terms"),
    ],
)
def test_refusals(refused, put, words, fault):
    put(VOCL3)
    assert fault in refused("scan", "a.xyz", "--bond", "V1-O2", "--from", "1.6", "--to", "1.8", "--steps", "5", *words)
