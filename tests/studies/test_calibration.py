"""Calibration: a changed set is found again; derivatives, covariance and left-out fits against independent routes."""

from __future__ import annotations

import json
from dataclasses import replace

import numpy as np
import pytest
from scipy.optimize import least_squares

import basis_params
from basis_params.reader import parse_table
from ehmo.errors import EhmoError, InputError
from ehmo.studies.calibration import Progress, calibrate, read_progress, read_spec
from ehmo.studies.calibration.least_squares import covariance, fit_parameters, robust_cost, without_species
from ehmo.studies.calibration.residuals import Residuals
from ehmo.studies.calibration.training import training_structures
from tests.calibration_cases import CHANGES, SPEC, put_case

STANDARD = basis_params.load_set("standard")


@pytest.fixture(scope="module")
def spec(tmp_path_factory):
    return read_spec(put_case(tmp_path_factory.mktemp("calibration")))


@pytest.fixture(scope="module")
def residuals(spec):
    return Residuals(STANDARD, spec.parameters, training_structures(spec, STANDARD), spec.observables, spec.unsettled)


@pytest.fixture(scope="module")
def fitted(residuals):
    start = np.array([parameter.start for parameter in residuals.parameters])
    return fit_parameters(residuals, start, say=lambda _: None)


@pytest.fixture(scope="module")
def calibration(spec):
    return calibrate(spec)


def test_a_changed_set_is_found_again(fitted, residuals):
    # Law: the observables are those of the changed set, so nothing but the weak priors keeps the fit from it.
    fit, _ = fitted
    assert [parameter.name for parameter in residuals.parameters] == list(CHANGES)
    assert fit.values == pytest.approx(list(CHANGES.values()), abs=0.02)


def test_residuals_vanish_at_the_changed_set(residuals):
    # Law; h_ii and constants are rounded to what is written.
    at_truth = residuals.all(np.array(list(CHANGES.values())))[: len(residuals.observables)]
    assert np.abs(at_truth).max() < 1e-4


def test_derivatives_equal_central_differences(residuals):
    # Cross-check: wide central differences of the residuals themselves.
    x = np.array([0.3, 1.8, 1.0])
    jacobian = residuals.jacobian(x)
    for column, step in enumerate((0.1, 0.02, 0.02)):
        move = np.eye(3)[column] * step
        slope = (residuals.all(x + move) - residuals.all(x - move)) / (2 * step)
        assert jacobian[:, column] == pytest.approx(slope, abs=0.05 * np.abs(slope).max())


def test_cost_is_that_of_scipy():
    # Cross-check: SciPy's soft_l1 cost at a point it may not move from.
    values = np.array([0.3, -2.0, 7.0])
    found = least_squares(lambda x: values + 0 * x[0], [0.0], loss="soft_l1", max_nfev=1)
    assert robust_cost(values) == pytest.approx(found.cost)


def test_covariance_of_a_linear_problem():
    # Closed formula: without residuals the inverse normal matrix; with large ones it is wider.
    random = np.random.default_rng(5)
    slopes = np.vstack([random.normal(size=(20, 3)), np.eye(3)])
    calm = covariance(np.zeros(23), slopes)
    assert calm == pytest.approx(np.linalg.inv(slopes.T @ slopes))
    wild = covariance(np.concatenate([np.full(20, 3.0), np.zeros(3)]), slopes)
    assert (np.diag(wild) > np.diag(calm)).all()


def test_left_out_fit_equals_a_whole_fit_without_that_species(residuals, fitted):
    # Independent route: the observables of that species are struck out and everything is fitted again.
    # Wrong values of one species make the two solutions differ.
    observables = tuple(replace(o, value=o.value + 0.1) if o.structure == "VOCl3" else o for o in residuals.observables)
    wrong = replace_observables(residuals, observables)
    start = fitted[0].values
    whole, slopes = fit_parameters(wrong, start, say=lambda _: None)
    found, settled = without_species(wrong, whole, slopes, "VOCl3")
    rest = replace_observables(residuals, tuple(o for o in observables if o.species != "VOCl3"))
    again, _ = fit_parameters(rest, start, say=lambda _: None)
    assert settled
    change = np.abs(whole.values - again.values).max()
    assert change > 0.02
    assert np.abs(found - again.values).max() < 0.2 * change


def replace_observables(residuals: Residuals, observables) -> Residuals:
    return Residuals(STANDARD, residuals.parameters, residuals.structures, observables, residuals.unsettled)


def test_a_strong_prior_holds_a_parameter(residuals):
    held = tuple(replace(p, sd=1e-6) if p.key == "lambda" else p for p in residuals.parameters)
    strong = Residuals(STANDARD, held, residuals.structures, residuals.observables, residuals.unsettled)
    fit, _ = fit_parameters(strong, np.array([p.start for p in held]), say=lambda _: None)
    assert fit.values[2] == pytest.approx(1.0, abs=1e-4)


def test_the_table_says_where_each_number_comes_from(calibration):
    table = parse_table(calibration.table_text, "written", "written", base=STANDARD)
    assert table.name == "changed"
    shell = next(shell for shell in table.elements["V"].shells if shell.label == "3d")
    assert shell.provenance == "derived"
    assert shell.source_key == "changed-calibration"
    old = next(s for s in STANDARD.elements["V"].shells if s.label == "3d")
    assert f"from {old.h_ii_eV:g}" in shell.locator
    assert old.source_key in shell.locator
    assert 0 < shell.h_ii_sd_eV < 1
    assert table.elements["Cl"] == STANDARD.elements["Cl"]
    assert 0 < table.settings.sd["K_pi"] < 0.2
    assert table.settings.K_pi == pytest.approx(CHANGES["K_pi"], abs=0.02)
    assert table.settings.K_sigma is None


def test_what_is_compared_is_what_the_written_table_gives(calibration):
    # Independent route: a whole bond report with the table as it stands in the file.
    from ehmo import bond_report
    from tests.published.structures import STRUCTURES

    table = parse_table(calibration.table_text, "written", "written", base=STANDARD)
    report = bond_report(STRUCTURES["VOCl3"].fragment(), table)
    orders = {report.bond_label(bond): order.mayer for bond, order in report.bonds()}
    row = next(r for r in calibration.fitted if r.observable.structure == "VOCl3" and r.observable.of == "V1-O2")
    assert row.trained == pytest.approx(orders["V1-O2"], abs=1e-9)


def test_errors_by_quantity(calibration):
    by_name = {row.quantity: row for row in calibration.errors()}
    rows = [row for row in calibration.fitted if row.observable.quantity == "charge"]
    assert by_name["charge"].count == len(rows) == 3
    expected = np.mean([abs(row.base - row.observable.value) for row in rows])
    assert by_name["charge"].base == pytest.approx(expected)
    assert by_name["charge"].trained < 0.01 < by_name["charge"].base
    assert by_name["charge"].left_out is not None


class StoppedError(Exception):
    """The run ends here."""


def test_a_run_that_was_stopped_goes_on(spec, calibration):
    texts: list[str] = []

    def keep(progress: Progress) -> None:
        texts.append(progress.text())
        if len(texts) == 3:
            raise StoppedError

    with pytest.raises(StoppedError):
        calibrate(spec, keep=keep)
    progress = read_progress(texts[-1], "p.json", spec)
    assert progress.values is not None
    again = calibrate(spec, progress=progress)
    # The last decimals depend on where the steps started; the table is that of a run in one piece within them.
    assert again.fit.values == pytest.approx(calibration.fit.values, abs=2e-3)


def test_finished_parts_are_not_done_again(spec, calibration):
    texts: list[str] = []
    calibrate(spec, keep=lambda progress: texts.append(progress.text()))
    said: list[str] = []
    again = calibrate(spec, progress=read_progress(texts[-1], "p.json", spec), say=said.append)
    assert again.table_text == calibration.table_text
    assert not any("without" in line or "cost" in line for line in said)


@pytest.mark.parametrize(
    ("change", "said"),
    [
        (lambda text: text[:1], "not the progress"),
        (lambda text: text.replace("progress 1", "progress 9"), "not the progress"),
        (lambda text: text.replace('_sha256": "', '_sha256": "x'), "another specification"),
        (lambda text: json.dumps({**json.loads(text), "values": [1.0]}), "damaged"),
        (lambda text: json.dumps({**json.loads(text), "left_out": 3}), "damaged"),
        (lambda text: text.replace("null", "NaN", 1), "damaged"),
    ],
)
def test_other_progress_is_refused(spec, change, said):
    with pytest.raises(InputError, match=said):
        read_progress(change(Progress(spec.sha256).text()), "p.json", spec)


FAULTS = {
    "syntax": (("name =", "name"), ["case.toml", "line 2"]),
    "unknown key": (('name = "changed"', 'name = "changed"\nnames = 1'), ["names", "unknown key", "known keys"]),
    "no name": (('name = "changed"', ""), ["name", "missing"]),
    "unknown parameter": (('"K_pi"', '"K_phi"'), ["fit 2, parameter", "K_phi", "choose from"]),
    "unknown shell": (('"V 3d"', '"V 4d"'), ["fit 1, of", "V 4d"]),
    "unknown element": (('"V 3d"', '"Xx 3d"'), ["Xx"]),
    "no sd": (("sd = 3.0", ""), ["fit 1, sd", "missing"]),
    "sd of zero": (("sd = 3.0", "sd = 0"), ["fit 1, sd", "above 0"]),
    "not finite": (("sd = 3.0", "sd = nan"), ["fit 1, sd", "finite"]),
    "start outside": (("sd = 3.0", "sd = 3.0\nlowest = 1.0"), ["fit 1, start", "between"]),
    "constant of an element": (('"K_pi"', '"K_pi"\nof = ["V 3d"]'), ["fit 2, of", "no element"]),
    "twice": (('"K_pi"', '"lambda"'), ["lambda is listed twice"]),
    "unknown quantity": (("charge = 0.02", "charges = 0.02"), ["sd.charges", "unknown key"]),
    "no such table": (("observables.csv", "nothing.csv"), ["nothing.csv"]),
    "no such structures": (("structures.xyz", "nothing.xyz"), ["nothing.xyz"]),
    "unknown base": (('name = "changed"', 'name = "changed"\nbase = "nothing"'), ["nothing"]),
    "state of nothing": (("[sd]", '[oxidation_states]\n"Fe" = 3\n[sd]'), ["oxidation_states.Fe"]),
    "state in words": (("[sd]", '[oxidation_states]\n"VOCl3" = "five"\n[sd]'), ["oxidation_states.VOCl3", "whole"]),
    "escape": (('"K_pi"', '"\\u001b[31m"'), ["fit 2, parameter"]),
}


@pytest.mark.parametrize(("change", "said"), FAULTS.values(), ids=FAULTS)
def test_a_bad_specification_is_one_line(tmp_path, change, said):
    assert change[0] in SPEC
    path = put_case(tmp_path, SPEC.replace(*change, 1))
    with pytest.raises(EhmoError) as caught:
        training_structures(read_spec(path), STANDARD)
    line = str(caught.value)
    assert "\n" not in line
    assert "\x1b" not in line
    for words in said:
        assert words in line


ROW_FAULTS = {
    "unknown quantity": ("Mayer order,V1-O2", "Mayer,V1-O2", ["line 2", "unknown quantity"]),
    "wrong unit": (",,e,", ",,eV,", ["unit is 'eV'"]),
    "no bond": ("V1-O2", "V1", ["line 2", "a bond"]),
    "bond that is not there": ("V1-O2", "V1-O9", ["line 2", "has no 'V1-O9'", "V1-O3"]),
    "unknown structure": ("VO4 3-,VO4 3-,", "VO4 3-,VO4,", ["line 2", "'VO4'"]),
    "negative sd": (",,,made", ",-1,,made", ["line 2", "sd is -1"]),
    "no provenance": ("derived", "rumour", ["line 2", "'rumour'"]),
    "formula": ("made here", "=cmd()", ["line 2", "formula"]),
    "other header": ("species,", "specie,", ["line 1", "header"]),
}


@pytest.mark.parametrize(("old", "new", "said"), ROW_FAULTS.values(), ids=ROW_FAULTS)
def test_a_bad_row_is_named(tmp_path, old, new, said):
    path = put_case(tmp_path)
    table = tmp_path / "observables.csv"
    assert old in table.read_text()
    table.write_text(table.read_text().replace(old, new, 1))
    with pytest.raises(EhmoError) as caught:
        training_structures(read_spec(path), STANDARD)
    for words in said:
        assert words in str(caught.value)
