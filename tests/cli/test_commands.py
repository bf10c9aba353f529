"""The commands as people type them: bond, demo, params."""

from __future__ import annotations

import json
import os
import subprocess
import sys
import threading
from pathlib import Path

import pytest

import basis_params
from basis_params.reader import COLUMNS
from ehmo import __version__
from ehmo.report.cautions import CAUTIONS
from tests.cli.conftest import VOCL3

WIDEST = 125
FILE_COLUMNS = ",".join(COLUMNS)


def document(ehmo, *words) -> dict:
    ran = ehmo("bond", "a.xyz", "--json", "-", *words)
    assert ran.status == 0, ran.err
    return json.loads(ran.out)


def oxo(found: dict) -> dict:
    return next(bond for bond in found["bonds"] if bond["kind"] == "oxo")


def test_bond_reports_every_bond(ehmo, put):
    put()
    ran = ehmo("bond", "a.xyz")
    assert (ran.status, ran.err) == (0, "")
    for words in ("V1-O2", "oxo", "V1-Cl3", "halide", "Mayer", "a.xyz", "charge 0", "given in the file"):
        assert words in ran.out
    assert all(" ".join(caution.split()) in " ".join(ran.out.split()) for caution in CAUTIONS)


def test_json_on_the_standard_output_replaces_the_text(ehmo, put):
    put()
    found = document(ehmo)
    assert found["fragment"]["formula"] == "Cl3OV"
    assert found["program_version"] == __version__


def test_json_in_a_file_comes_beside_the_text(ehmo, put, tmp_path):
    put()
    plain = ehmo("bond", "a.xyz")
    ran = ehmo("bond", "a.xyz", "--json", "report.json")
    assert ran == plain
    assert json.loads((tmp_path / "report.json").read_text(encoding="utf-8")) == document(ehmo)
    assert sorted(path.name for path in tmp_path.iterdir()) == ["a.xyz", "report.json"]


def test_json_file_replaces_an_older_one_whole_and_has_usual_permissions(ehmo, put, tmp_path):
    put()
    target = tmp_path / "report.json"
    target.write_text("old " * 100_000)
    assert ehmo("bond", "a.xyz", "--json", target).status == 0
    json.loads(target.read_text(encoding="utf-8"))
    mask = os.umask(0)
    os.umask(mask)
    assert target.stat().st_mode & 0o777 == 0o666 & ~mask


@pytest.mark.skipif(sys.platform == "win32", reason="links and pipes are those of Unix")
def test_json_through_a_link_keeps_the_link(ehmo, put, tmp_path):
    put()
    real, link = tmp_path / "real.json", tmp_path / "link.json"
    link.symlink_to(real)
    assert ehmo("bond", "a.xyz", "--json", link).status == 0
    assert link.is_symlink()
    assert json.loads(real.read_text(encoding="utf-8"))["schema"]


@pytest.mark.skipif(sys.platform == "win32", reason="links and pipes are those of Unix")
def test_json_into_a_pipe_is_written_and_the_pipe_stays(ehmo, put, tmp_path):
    # A pipe stands for every special file: renaming over one would destroy it.
    put()
    pipe = tmp_path / "pipe"
    os.mkfifo(pipe)
    heard: list[str] = []
    listener = threading.Thread(target=lambda: heard.append(pipe.read_text(encoding="utf-8")), daemon=True)
    listener.start()
    assert ehmo("bond", "a.xyz", "--json", pipe).status == 0
    listener.join(timeout=30)
    assert pipe.is_fifo()
    assert json.loads(heard[0])["schema"]


def test_several_frames_give_several_reports(ehmo, put):
    put(VOCL3 + VOCL3.replace("1.57", "1.67"))
    found = document(ehmo)
    first, second = (oxo(report) for report in found["reports"])
    assert (first["length_A"], second["length_A"]) == (pytest.approx(1.57), pytest.approx(1.67))
    assert first["mayer"] > second["mayer"]
    assert ehmo("bond", "a.xyz").out.count("Bonds of V1") == 2


def test_options_reach_the_calculation(ehmo, put):
    put()
    plain = document(ehmo)
    assert plain["method"]["charge_model"] == "self-consistent"
    fixed = document(ehmo, "--charges", "fixed")
    assert (fixed["method"]["charge_model"], fixed["method"]["iterations"]) == ("fixed", 1)
    assert fixed["atoms"][0]["mulliken_charge"] > plain["atoms"][0]["mulliken_charge"]
    without = document(ehmo, "--lambda", "0")
    assert oxo(without)["mayer"] == pytest.approx(oxo(fixed)["mayer"], abs=1e-9)
    for words, key, value in (
        (("--K", "2.0"), "K", 2.0),
        (("--K-sigma", "1.67"), "K_sigma", 1.67),
        (("--K-pi", "2.0"), "K_pi", 2.0),
        (("--K-delta", "1.5"), "K_delta", 1.5),
        (("--K-decay", "0.35"), "K_decay_per_A", 0.35),
        (("--weighting", "off"), "weighting", False),
        (("--lambda", "0.5"), "lambda", 0.5),
    ):
        changed = document(ehmo, *words)
        assert changed["method"][key] == value
        assert oxo(changed)["mayer"] != pytest.approx(oxo(plain)["mayer"], abs=1e-6) or key == "K_delta"


def test_charge_and_spin_options_override_the_file(ehmo, put):
    put()
    found = document(ehmo, "--charge", "-2", "--unpaired", "2")
    assert (found["fragment"]["charge"], found["fragment"]["unpaired_electrons"]) == (-2, 2)
    assert sum(atom["mulliken_charge"] for atom in found["atoms"]) == pytest.approx(-2)
    assert sum(atom["spin_population"] for atom in found["atoms"]) == pytest.approx(2)


def test_guesses_are_printed_with_their_reason(ehmo, put):
    put(VOCL3.replace("VOCl3 charge=0 unpaired=0", ""))
    ran = ehmo("bond", "a.xyz")
    assert ran.status == 0
    assumed = ran.out.split("Assumed")[1].split("To doubt")[0]
    assert "charge 0" in assumed
    assert "unpaired electrons 0" in assumed
    assert "given" not in assumed


def test_limits_can_be_raised(ehmo, put):
    put()
    enough = ("--max-atoms", "5", "--max-bytes", "1000", "--max-functions", "25", "--max-iterations", "40")
    assert ehmo("bond", "a.xyz", *enough).status == 0


def test_demo_says_that_it_is_invented_and_runs_the_main_job(ehmo):
    ran = ehmo("demo")
    assert (ran.status, ran.err) == (0, "")
    assert "invented" in ran.out
    assert "one sigma, two pi" in ran.out
    assert max(map(len, ran.out.splitlines())) <= WIDEST


def test_demo_takes_the_options_of_bond(ehmo):
    found = json.loads(ehmo("demo", "--json", "-", "--charges", "fixed").out)
    assert found["method"]["charge_model"] == "fixed"
    assert {"oxo", "alkoxo", "aqua"} <= {bond["kind"] for bond in found["bonds"]}


def test_params_list_names_the_shipped_sets(ehmo):
    ran = ehmo("params", "list")
    assert ran.status == 0
    for name in basis_params.available_sets():
        assert name in ran.out


def test_params_show_gives_rows_with_sources(ehmo):
    ran = ehmo("params", "show", "standard", "V", "O")
    assert ran.status == 0
    assert "3d" in ran.out
    assert "2p" in ran.out
    table = basis_params.load_set("standard")
    assert table.element("V").shells[0].source_key in ran.out
    assert "Cr " not in ran.out.split("Notes")[0]


def test_params_check_gives_the_audits(ehmo):
    ran = ehmo("params", "check", "standard")
    assert ran.status == 0
    assert "outlier" in ran.out


@pytest.mark.parametrize("words", [("--help",), ("bond", "--help"), ("demo", "--help"), ("params", "show", "--help")])
def test_help(ehmo, words):
    ran = ehmo(*words)
    assert ran.status == 0
    assert "usage:" in ran.out


def test_version(ehmo):
    assert ehmo("--version").out.strip() == f"ehmo {__version__}"


def own_table(*head: str, elements: str = "V O Cl") -> str:
    """Rows of the shipped set as a user would type them, under a header of their own."""
    lines = [*head, FILE_COLUMNS]
    for symbol in elements.split():
        element = basis_params.load_set("standard").element(symbol)
        for shell in element.shells:
            pairs = [str(x) for pair in zip(shell.zetas, shell.coefficients, strict=True) for x in pair]
            pairs += [""] * (4 - len(pairs))
            lines.append(
                f"{symbol},{element.valence_electrons},{shell.n},{'spdf'[shell.l]},{shell.h_ii_eV},{','.join(pairs)},"
                "own,notebook page 3,read"
            )
    return "\n".join(lines) + "\n"


def test_own_table_is_used_and_what_it_leaves_out_is_reported(ehmo, put):
    put()
    put(own_table("# name = bench", "# edition = 2026", "# K = 1.9"), "mine.csv")
    found = document(ehmo, "--params", "mine.csv")
    method = found["method"]
    assert (method["parameter_set"], method["parameter_edition"], method["K"]) == ("bench", "2026", 1.9)
    assert method["parameter_origin"].endswith("mine.csv")
    (said,) = [sentence for sentence in found["assumptions"] if "bench" in sentence]
    for key in ("lambda", "weighting", "K_decay_per_A"):
        assert key in said
    assert "standard" in said
    text = " ".join(ehmo("bond", "a.xyz", "--params", "mine.csv").out.split())
    assert said in text
    # The option stands above the table, the table above the shipped set.
    assert document(ehmo, "--params", "mine.csv", "--K", "1.6")["method"]["K"] == 1.6


def test_own_table_with_the_shipped_rows_gives_the_shipped_numbers(ehmo, put):
    put()
    put(own_table(), "mine.csv")
    own, shipped = document(ehmo, "--params", "mine.csv"), document(ehmo)
    assert own["method"]["parameter_sha256"] != shipped["method"]["parameter_sha256"]
    for ours, theirs in zip(own["bonds"], shipped["bonds"], strict=True):
        assert ours["mayer"] == pytest.approx(theirs["mayer"], abs=1e-7)


def test_own_table_can_be_shown_and_checked(ehmo, put):
    put(own_table("# name = bench"), "mine.csv")
    shown = ehmo("params", "show", "mine.csv")
    assert shown.status == 0
    assert "taken from the standard set" in shown.out
    assert "notebook page 3" in shown.out
    assert ehmo("params", "check", "mine.csv").status == 0


# What only a process of its own can show.

ROOT = Path(__file__).parents[2]


def process(*words: str, **settings) -> subprocess.CompletedProcess[str]:
    paths = os.pathsep.join([str(ROOT), os.environ.get("PYTHONPATH", "")])
    return subprocess.run(
        [sys.executable, "-m", "ehmo", *words],
        env={**os.environ, "PYTHONPATH": paths, **settings.pop("env", {})},
        text=True,
        check=False,
        stderr=subprocess.PIPE,
        **settings,
    )


def test_module_form_is_the_command(tmp_path):
    ran = process("demo", stdout=subprocess.PIPE, cwd=tmp_path)
    assert (ran.returncode, ran.stderr) == (0, "")
    assert "Bonds of V1" in ran.stdout


def test_terminal_without_unicode_gets_question_marks_and_no_traceback(tmp_path):
    plain = {"PYTHONIOENCODING": "ascii", "PYTHONUTF8": "0"}
    ran = process("demo", stdout=subprocess.PIPE, cwd=tmp_path, env=plain)
    assert (ran.returncode, ran.stderr) == (0, "")
    assert "H?ckel" in ran.stdout


def test_reader_of_a_pipe_that_goes_away_is_no_fault(tmp_path):
    reading, writing = os.pipe()
    os.close(reading)
    ran = process("params", "show", "standard", stdout=writing, cwd=tmp_path)
    os.close(writing)
    assert (ran.returncode, ran.stderr) == (0, "")


def test_full_disk_behind_the_standard_output_is_one_line(tmp_path):
    full = Path("/dev/full")
    if not full.is_char_device():
        pytest.skip("no /dev/full on this machine")
    with full.open("w") as nowhere:
        ran = process("demo", stdout=nowhere, cwd=tmp_path)
    assert ran.returncode == 2
    assert ran.stderr.startswith("ehmo: cannot write the output")
    assert ran.stderr.count("\n") == 1


def test_tables_and_citations_take_the_place_of_the_report(ehmo, put, refused):
    put()
    for form, start in (("latex", "% needs"), ("markdown", "| bond |"), ("csv", "structure,bond,kind")):
        ran = ehmo("bond", "a.xyz", "--table", form, "--json", "r.json")
        assert (ran.status, ran.err) == (0, "")
        assert ran.out.startswith(start)
        assert "Cautions" not in ran.out
    assert "[1] M. Wolfsberg" in ehmo("bond", "a.xyz", "--cite").out
    assert "@article{wolfsberg-1952," in ehmo("bond", "a.xyz", "--cite", "bibtex").out
    assert "--json" in refused("bond", "a.xyz", "--table", "csv", "--json", "-")
    assert "not allowed with" in refused("bond", "a.xyz", "--table", "csv", "--cite")
    assert "choose from" in refused("bond", "a.xyz", "--table", "word")


def test_tables_and_citations_of_an_extended_structure(ehmo, put):
    from tests.crystal.test_report import RUTILE

    put(RUTILE.replace("Ti1 Ti", "=Ti|1$ Ti"), "r.cif")
    ran = ehmo("bond", "r.cif", "--mesh", "2,2,2", "--table", "csv")
    assert (ran.status, ran.err) == (0, "")
    assert all(line.split(",")[1].startswith("'=Ti|1$-O1") for line in ran.out.splitlines()[1:])
    assert r"=Ti\textbar{}1\$-O1" in ehmo("bond", "r.cif", "--mesh", "2,2,2", "--table", "latex").out
    assert "Monkhorst" in ehmo("bond", "r.cif", "--mesh", "2,2,2", "--cite").out


def test_works_of_all_structures_are_listed_once(ehmo, put):
    put(VOCL3 + VOCL3)
    out = ehmo("bond", "a.xyz", "--cite", "bibtex").out
    assert out.count("@article{hoffmann-1963,") == 1
    assert ehmo("bond", "a.xyz", "--cite").out.count("Extended-Hückel calculations") == 1
