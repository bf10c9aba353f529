"""README says what the program does: its examples run, its commands parse, its JSON fields are those written."""

import doctest
import re
import shlex
from dataclasses import replace
from pathlib import Path

import pytest

import ehmo
from ehmo.cli import _parser
from ehmo.records.health import AntibondingShell, ShellPopulation
from ehmo.report.cautions import CAUTIONS
from ehmo.report.document import bond_document
from ehmo.report.scan_document import scan_document
from ehmo.studies.spread import spread_report
from tests.energy.test_scan_energies import scan
from tests.geometries import SPECIES

ROOT = Path(__file__).parents[1]
README = (ROOT / "README.md").read_text(encoding="utf-8")
COMMANDS = [line.split("  #")[0] for line in README.splitlines() if line.startswith("ehmo ")]


@pytest.mark.usefixtures("calibrated")
def test_python_examples_give_what_they_show():
    blocks = re.findall(r"```python\n(.*?)```", README, re.DOTALL)
    example = doctest.DocTestParser().get_doctest("\n".join(blocks), {}, "README.md", "README.md", 0)
    assert example.examples
    runner = doctest.DocTestRunner(verbose=False)
    said = []
    assert runner.run(example, out=said.append).failed == 0, "".join(said)


@pytest.mark.parametrize("command", COMMANDS)
def test_commands_parse(command):
    assert callable(_parser().parse_args(shlex.split(command)[1:]).handler)


FREE_KEYS = {
    "metal_hybrid",
    "donor_hybrid",
    "configuration",
    "crystal_field_per_cm",
    "doublet_g_tensor",
    "constants",
} | {
    *("shell_shares", "shell_populations", "functions", "overlap_by_shells", "overlap_by_irrep"),
}
"""Fields whose keys are names of shells, levels or parameters, or are described elsewhere."""


@pytest.fixture(scope="module")
def document() -> dict:
    options = ehmo.Options(observed_bands_per_cm=(13000.0, 16000.0))
    report = spread_report(SPECIES["[VO(OH2)5]2+"].fragment(), options=options, draws=2)
    ill = {
        "impossible_populations": (ShellPopulation(0, "4p", -0.1),),
        "antibonding_shells": (AntibondingShell(0, "4p", -0.1),),
    }
    return bond_document(replace(report, health=replace(report.health, **ill)))


def keys_within(value) -> set[str]:
    """Keys of a value and of all that it holds."""
    if isinstance(value, list):
        return keys_within(value[0]) if value else set()
    if not isinstance(value, dict):
        return set()
    return set(value).union(*(keys_within(inner) for key, inner in value.items() if key not in FREE_KEYS))


def test_every_part_of_the_document_is_described(document):
    described = {name for line in README.splitlines() for name in re.findall(r"`(\w+)`", line)}
    assert set(document) <= described


@pytest.mark.parametrize(
    "key",
    [
        *(
            "fragment",
            "method",
            "symmetry",
            "orbitals",
            "atoms",
            "populations_by_irrep",
            "ligands",
            "bonds",
            "ladder",
            "shell_constants",
        ),
        *("terms", "bands", "g_tensor", "magnetism", "band_fit", "local_frames", "health", "assumptions"),
        "spread",
    ],
)
def test_json_fields_are_those_in_the_table(key, document):
    row = next(line for line in README.splitlines() if re.match(rf"\| (`\w+`, )*`{key}`[ ,]", line))
    written = keys_within(document[key])
    assert set(re.findall(r"`(\w+)`", row.split("|")[2])) == written


def test_json_fields_of_a_scan_are_those_in_its_table():
    found = scan_document(scan("[VO(OH2)5]2+", "V1-O2", 1.5, 1.9, 9, isotopes={"O2": 18}))
    table = README.split("### JSON of a scan")[1].split("\n## ")[0]
    assert {name for line in table.splitlines() for name in re.findall(r"`(\w+)`", line)} == keys_within([found])
    assert {"modes", "stretches", "mulliken_charges"} <= keys_within([found])


def test_cautions_are_those_of_the_reports():
    text = " ".join(README.split())
    for caution in CAUTIONS:
        for part in re.split(r"[;:] ", caution.rstrip(".")):
            assert part.replace(",", "") in text.replace(",", "")


def test_parameter_header_is_the_one_that_is_read(tmp_path):
    header = next(line for line in README.splitlines() if line.startswith("element,"))
    shipped = (ROOT / "basis_params" / "sets" / "standard.csv").read_text(encoding="utf-8")
    assert any(line.startswith(header) for line in shipped.splitlines())
