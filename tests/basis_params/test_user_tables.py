"""A user's own table in a whole calculation."""

import pytest

import basis_params
import ehmo
from basis_params.reader import parse_table
from tests.geometries import SPECIES

STANDARD = basis_params.load_set("standard")


def own(text):
    return parse_table(text, "own.csv", "own", base=STANDARD)


def test_three_equal_exponents_are_one():
    """Law: a third, three times, of one normalised function is that function."""
    lines = basis_params.format_table(STANDARD).splitlines()
    head = next(i for i, line in enumerate(lines) if line.startswith("element,"))
    columns = lines[head].split(",")
    row = next(i for i, line in enumerate(lines) if line.startswith("O,6,2,p"))
    cells = dict(zip(columns, lines[row].split(","), strict=True))
    zeta = cells["zeta1"]
    third = repr(1 / 3)
    cells |= {"zeta2": zeta, "zeta3": zeta, "c1": third, "c2": third, "c3": third}
    lines[row] = ",".join(cells[name] for name in columns)
    table = own("\n".join(lines))
    assert table.element("O").shells[1].zetas == (2.275,) * 3
    fragment = SPECIES["VOCl3"].fragment()
    plain, split = ehmo.bond_report(fragment, STANDARD), ehmo.bond_report(fragment, table)
    assert split.overlap == pytest.approx(plain.overlap, abs=1e-9)
    assert [o.mayer for o in split.orders] == pytest.approx([o.mayer for o in plain.orders], abs=1e-8)


def test_missing_header_keys_are_taken_from_standard_and_said(tmp_path):
    text = basis_params.format_table(STANDARD)
    kept = [line for line in text.splitlines() if not line.startswith(("# lambda", "# weighting", "# name"))]
    path = tmp_path / "mine.csv"
    path.write_text("\n".join(kept) + "\n", "utf-8")
    report = ehmo.bond_report(SPECIES["VOCl3"].fragment(), str(path))
    assert report.method.lambda_ == STANDARD.settings.lambda_
    assert any("mine does not state weighting, lambda: taken from the standard set" in a for a in report.assumptions)


def test_an_element_outside_the_set_is_named_with_the_set():
    rows = [line for line in basis_params.format_table(STANDARD).splitlines() if not line.startswith(("Cl,", "# name"))]
    with pytest.raises(ehmo.EhmoError, match=r"Cl.*own"):
        ehmo.bond_report(SPECIES["VOCl3"].fragment(), own("\n".join(rows)))


def test_content_hash_is_stable():
    """Frozen 2026 with the first edition of the form: the hash keys stored results, so it must not drift."""
    text = "element,valence_electrons,n,l,h_ii_eV,zeta1,c1,zeta2,c2,source_key,locator,read_or_memory\n"
    head = "# name = own\n# edition = 1\n# K = 1.75\n# weighting = yes\n# K_sigma = K\n# K_pi = K\n# K_delta = K\n"
    head += "# K_decay_per_A = 0\n# lambda = 0.8\n"
    table = parse_table(head + text + "H,1,1,s,-13.6,1.3,,,,own,table 1,memory\n", "own.csv", "own")
    assert table.content_sha256 == "5c144bfdbbf8691c6608d72a0eae75d23cf0856c79cdfe428cf664e0af54ac3f"
