"""The method paragraph names and cites what that very run used."""

from __future__ import annotations

import re

import pytest

import basis_params
from ehmo import Options, bond_report
from ehmo.orbitals.parameters import load_parameters
from ehmo.report.method import method_paragraph
from tests.geometries import SPECIES

TABLE = load_parameters("standard")


def paragraph(name: str, **options):
    return method_paragraph(bond_report(SPECIES[name].fragment(), TABLE, Options(**options)), TABLE)


def cited(key: str) -> str:
    return basis_params.references()[key].text


@pytest.mark.parametrize("name", ["[VO(OH2)5]2+", "MnO4 -", "UO2 2+", "Cr(CO)6"])
def test_numbers_and_works_go_together(name):
    found = paragraph(name)
    numbers = []
    for group in re.findall(r"\[([\d, –]+)\]", found.text):
        for part in group.split(", "):
            first, _, last = part.partition("–")
            numbers += range(int(first), int(last or first) + 1)
    assert set(numbers) == set(range(1, len(found.citations) + 1))
    # Works are numbered as they first occur.
    assert list(dict.fromkeys(numbers)) == sorted(set(numbers))
    assert len(set(found.citations)) == len(found.citations)
    assert str(found).splitlines()[-1] == f"[{len(found.citations)}] {found.citations[-1]}"


def test_only_what_was_used_is_cited():
    usual, fixed = paragraph("[VO(OH2)5]2+"), paragraph("[VO(OH2)5]2+", charge_model="fixed", weighting=False)
    for key in ("ohno-1964", "ammeter-1978"):
        assert cited(key) in usual.citations
        assert cited(key) not in fixed.citations
    assert cited("wolfsberg-1952") in fixed.citations
    assert cited("racah-1942") in usual.citations  # d1 has terms
    assert cited("racah-1942") not in paragraph("Cr(CO)6").citations or "Terms" in paragraph("Cr(CO)6").text


def test_parameter_sources_of_the_elements_are_cited():
    found = paragraph("VOCl3")
    for symbol in ("V", "O", "Cl"):
        for shell in TABLE.elements[symbol].shells:
            assert cited(shell.source_key) in found.citations
    assert TABLE.content_sha256[:12] in found.text


def test_constants_in_force_are_given():
    text = paragraph("VOCl3", K=1.9, K_pi=2.0, lambda_=0.7).text
    assert "K = 1.9 (sigma), 2 (pi), 1.9 (delta)" in text
    assert "lambda = 0.7" in text
