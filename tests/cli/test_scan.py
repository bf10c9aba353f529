"""``ehmo scan``: table, files, restart and refusals."""

from __future__ import annotations

import json

from tests.cli.conftest import VOCL3

RANGE = ("--from", "1.5", "--to", "1.8", "--steps", "4")


def test_table_and_files(ehmo, put, tmp_path):
    put(VOCL3)
    ran = ehmo("scan", "a.xyz", "--bond", "V1-O2", *RANGE, "--csv", "s.csv", "--json", "s.json")
    assert (ran.status, ran.err) == (0, "")
    for words in (
        "scan of the length V1-O2, 4 points",
        "Bond V1-O2",
        "Ladder",
        "Withheld",
        "not calibrated",
        "Cautions",
    ):
        assert words in ran.out
    assert len((tmp_path / "s.csv").read_text().splitlines()) == 5
    found = json.loads((tmp_path / "s.json").read_text())
    assert found["schema"] == "ehmo scan 1"
    assert [point["value"] for point in found["points"]] == [1.5, 1.6, 1.7, 1.8]


def test_a_second_run_continues_the_file(ehmo, put, tmp_path):
    put(VOCL3)
    ehmo("scan", "a.xyz", "--bond", "V1-O2", *RANGE, "--json", "s.json")
    document = json.loads((tmp_path / "s.json").read_text())
    kept = document["points"][:2]
    kept[0]["ground_term"] = "kept"
    (tmp_path / "s.json").write_text(json.dumps({**document, "points": kept}))
    assert ehmo("scan", "a.xyz", "--bond", "V1-O2", *RANGE, "--json", "s.json").status == 0
    again = json.loads((tmp_path / "s.json").read_text())["points"]
    assert [point["value"] for point in again] == [1.5, 1.6, 1.7, 1.8]
    assert again[0]["ground_term"] == "kept"


def test_angle(ehmo, put):
    put(VOCL3)
    ran = ehmo("scan", "a.xyz", "--angle", "O2-V1-Cl3", "--from", "95", "--to", "115", "--steps", "3")
    assert ran.status == 0
    assert "scan of the angle O2-V1-Cl3" in ran.out
    assert "angle/degree" in ran.out


def test_json_on_the_standard_output(ehmo, put):
    put(VOCL3)
    assert len(json.loads(ehmo("scan", "a.xyz", "--bond", "V1-O2", *RANGE, "--json", "-").out)["points"]) == 4


def test_refusals(refused, put):
    put(VOCL3)
    assert "choose from" in refused("scan", "a.xyz", "--bond", "O2-Cl3", *RANGE)
    assert "no atom" in refused("scan", "a.xyz", "--bond", "V1-Xx9", *RANGE)
    assert "--steps" in refused("scan", "a.xyz", "--bond", "V1-O2", "--from", "1.5", "--to", "1.5")
    refused("scan", "a.xyz", *RANGE)
    refused("scan", "a.xyz", "--bond", "V1-O2", "--from", "1.5")


def test_a_file_that_is_no_scan_is_left_alone(refused, put):
    put(VOCL3)
    put('{"schema": "something else"}', "s.json")
    assert "s.json" in refused("scan", "a.xyz", "--bond", "V1-O2", *RANGE, "--json", "s.json")
