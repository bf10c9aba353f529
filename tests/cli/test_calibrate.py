"""``ehmo calibrate``: table, text, JSON, progress and refusals."""

from __future__ import annotations

import json

import pytest

import basis_params
from tests.calibration_cases import CHANGES, SPEC, put_case


@pytest.fixture
def case(tmp_path):
    # One parameter is enough here; the numbers are tested with the study.
    lines = SPEC.split("[[fit]]")
    return put_case(tmp_path, "[[fit]]".join([lines[0], lines[2]]))


def test_table_text_and_json(ehmo, case, tmp_path):
    ran = ehmo("calibrate", case, "--json", "c.json", "--progress", "p.json")
    assert ran.status == 0
    for words in ("set changed (edition 1) from standard", "mean difference", "species left out", "K_pi", "Cautions"):
        assert words in ran.out
    assert "cost" in ran.err
    assert "without VOCl3 (2 of 3)" in ran.err
    table = basis_params.read_table(tmp_path / "changed.csv")
    found = json.loads((tmp_path / "c.json").read_text())
    assert found["schema"] == "ehmo calibration 1"
    assert found["parameters"][0]["name"] == "K_pi"
    assert table.settings.K_pi == pytest.approx(found["parameters"][0]["fitted"], abs=1e-4)
    assert len(found["observables"]) == 12 - 1
    assert json.loads((tmp_path / "p.json").read_text())["left_out"].keys() == {"VO4 3-", "VOCl3", "[VOCl4]2-"}
    assert ehmo("params", "show", "changed.csv", "V").status == 0


def test_the_table_serves_a_report(ehmo, case, put, tmp_path):
    from tests.cli.conftest import VOCL3

    ehmo("calibrate", case, "--no-left-out", "--quiet")
    put(VOCL3)
    ran = ehmo("bond", "a.xyz", "--params", "changed.csv")
    assert ran.status == 0
    assert "changed" in ran.out


def test_quiet_without_left_out_species(ehmo, case):
    ran = ehmo("calibrate", case, "--no-left-out", "--quiet", "--json", "-")
    assert (ran.status, ran.err) == (0, "")
    found = json.loads(ran.out)
    assert {row["left_out"] for row in found["observables"]} == {None}
    assert found["parameters"][0]["fitted"] > CHANGES["K_pi"] - 1


def test_refusals(refused, case, tmp_path):
    assert "nothing.toml" in refused("calibrate", "nothing.toml")
    assert "overwrite" in refused("calibrate", case, "--table", "case.toml")
    assert "needs a path" in refused("calibrate", case, "--progress", "")
    assert "no such folder" in refused("calibrate", case, "--table", "none/x.csv")
    (tmp_path / "other.json").write_text("{}")
    assert "not the progress" in refused("calibrate", case, "--progress", "other.json")
    case.write_text(case.read_text().replace("sd = 0.5", "sd = x"))
    assert "case.toml: not valid TOML" in refused("calibrate", case)
    case.write_bytes(b"\xff\xfe\x00")
    assert "UTF-8" in refused("calibrate", case)
