"""README says what the program does: its examples run, its commands parse, its JSON fields are those written."""

import doctest
import re
import shlex
from pathlib import Path

import pytest

import ehmo
from ehmo.cli import _parser
from ehmo.report.cautions import CAUTIONS
from ehmo.report.document import bond_document
from tests.geometries import SPECIES

ROOT = Path(__file__).parents[1]
README = (ROOT / "README.md").read_text(encoding="utf-8")
COMMANDS = [line.split("  #")[0] for line in README.splitlines() if line.startswith("ehmo ")]


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


@pytest.mark.parametrize(
    "key", ["fragment", "method", "orbitals", "atoms", "ligands", "bonds", "local_frames", "assumptions"]
)
def test_json_fields_are_those_in_the_table(key):
    document = bond_document(ehmo.bond_report(SPECIES["[VO(OH2)5]2+"].fragment()))
    row = next(line for line in README.splitlines() if re.match(rf"\| (`\w+`, )*`{key}`[ ,]", line))
    cells = row.split("|")
    value = document[key]
    record = value[0] if isinstance(value, list) else value
    if isinstance(record, dict):
        written = set(record)
        for inner in record.values():
            if isinstance(inner, list) and inner and isinstance(inner[0], dict):
                written |= set(inner[0])
        assert set(re.findall(r"`(\w+)`", cells[2])) == written
    assert {name for line in README.splitlines() for name in re.findall(r"`(\w+)`", line)} >= set(document)


def test_cautions_are_those_of_the_reports():
    text = " ".join(README.split())
    for caution in CAUTIONS:
        for part in re.split(r"[;:] ", caution.rstrip(".")):
            assert part.replace(",", "") in text.replace(",", "")


def test_parameter_header_is_the_one_that_is_read(tmp_path):
    header = next(line for line in README.splitlines() if line.startswith("element,"))
    shipped = (ROOT / "basis_params" / "sets" / "standard.csv").read_text(encoding="utf-8")
    assert header in shipped.splitlines()
