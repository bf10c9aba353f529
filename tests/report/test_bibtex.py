"""BibTeX entries of the works that a run used."""

import re

import basis_params
from ehmo import bond_report
from ehmo.orbitals.parameters import load_parameters
from ehmo.report.bibtex import bibtex
from ehmo.report.method import method_paragraph
from tests.geometries import SPECIES

TABLE = load_parameters("standard")


def test_every_work_of_the_bibliography_makes_a_whole_entry():
    text = bibtex(basis_params.references())
    entries = text.strip().split("\n\n")
    assert len(entries) == len(basis_params.references())
    for key, entry in zip(basis_params.references(), entries, strict=True):
        assert re.match(r"@(article|misc)\{" + re.escape(key) + ",\n", entry)
        assert entry.count("{") - entry.count(r"\{") == entry.count("}") - entry.count(r"\}")
        assert "  author = {" in entry
        assert "  title = {" in entry or entry.startswith("@article")
    assert "year = {1963}" in text
    assert "author = {J. H. Ammeter and H.-B. Bürgi and J. C. Thibeault and R. Hoffmann}" in text
    assert "{NIST ASD Team}" in text


def test_keys_of_a_paragraph_are_those_of_its_citations():
    found = method_paragraph(bond_report(SPECIES["[VO(OH2)5]2+"].fragment()), TABLE)
    known = basis_params.references()
    assert [known[key].text for key in found.keys] == list(found.citations)
    for key in ("griffith-1961", "van-vleck-1932", "mulliken-1939", "brown-1985", "nist-asd"):
        assert key in found.keys or key == "nist-asd"


def test_parameters_of_charges_and_bond_valences_are_cited():
    from ehmo import Options

    usual = method_paragraph(bond_report(SPECIES["[UO2(OH2)5]2+"].fragment()), TABLE)
    assert "burns-1997" in usual.keys
    assert basis_params.atom("U").source_key in usual.keys
    fixed = bond_report(SPECIES["Cr(CO)6"].fragment(), options=Options(charge_model="fixed"))
    assert basis_params.atom("Cr").source_key not in method_paragraph(fixed, TABLE).keys


def test_a_key_of_a_users_table_cannot_break_an_entry():
    text = bibtex(["my {thesis}, 2020 % \\input{x}", "", "hoffmann-1963", "hoffmann-1963"])
    assert text.count("@") == 3
    assert r"\input" not in text
    assert text.startswith("@misc{my-thesis-2020-input-x,\n")
