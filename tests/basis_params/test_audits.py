"""Audits of the shipped sets and of the formulas they rest on."""

import re

import numpy as np
import pytest
from scipy.integrate import quad
from scipy.special import factorial

import basis_params
from basis_params.audits import BOUNDS, audit
from basis_params.slater import mean_radius, radial_moment

OUTLIER_NOTE = re.compile(r"Audit outlier: (\w+) (\w+) (\w+) (\d\.\d\d)\b.*")


def slater(n, zeta, r):
    return (2 * zeta) ** (n + 0.5) / np.sqrt(factorial(2 * n)) * r**n * np.exp(-zeta * r)


@pytest.mark.parametrize("power", [0, 1, 2])
@pytest.mark.parametrize(
    ("n", "zetas", "coefficients"),
    [(5, (4.982, 2.068), (0.6685, 0.5424)), (3, (6.2, 2.9, 1.3), (0.31, 0.52, 0.33)), (2, (2.275,), (1.0,))],
)
def test_radial_moments_equal_quadrature(power, n, zetas, coefficients):
    """Cross-check: SciPy quadrature of the function itself."""

    def integrand(r):
        return r**power * sum(c * slater(n, z, r) for z, c in zip(zetas, coefficients, strict=True)) ** 2

    assert radial_moment(n, zetas, coefficients, power) == pytest.approx(quad(integrand, 0, 30, epsabs=1e-11)[0])


@pytest.mark.parametrize("n", range(1, 8))
def test_mean_radius_of_one_slater_function(n):
    """Law: <r> = (2n+1)/(2 zeta), whatever the coefficient."""
    assert mean_radius(n, (1.7,), (0.3,)) == pytest.approx((2 * n + 1) / 3.4, rel=1e-14)


@pytest.mark.parametrize("name", basis_params.available_sets())
def test_outliers_are_exactly_those_named_in_the_notes(name):
    table = basis_params.load_set(name)
    named = {match.groups() for note in table.notes if (match := OUTLIER_NOTE.fullmatch(note))}
    found = {(r.element, r.shell, r.check, f"{r.ratio:.2f}") for r in audit(table).outliers}
    assert found == named


@pytest.mark.parametrize("name", basis_params.available_sets())
def test_every_shell_is_held_against_a_computed_atom(name):
    rows = audit(basis_params.load_set(name)).rows
    assert not [row for row in rows if row.status == "no reference"]
    assert {row.check for row in rows if row.shell != "pair"} == {check for check, _ in BOUNDS} - {"range", "softness"}


def test_a_slipped_digit_is_found():
    table = basis_params.load_set("standard")
    text = basis_params.format_table(table).replace("V,5,4,s,-8.81,1.3", "V,5,4,s,-88.1,0.3")
    slipped = basis_params.reader.parse_table(text, "own.csv", "own")
    found = {(row.element, row.shell, row.check) for row in audit(slipped).outliers}
    known = {(row.element, row.shell, row.check) for row in audit(table).outliers}
    assert {("V", "4s", "radius"), ("V", "4s", "energy")} <= found - known


def test_an_element_outside_the_computed_ones_is_reported_as_unchecked():
    row = "He,2,1,s,-24.5,1.69,,,,own,x,memory"
    text = basis_params.format_table(basis_params.load_set("standard")).rstrip() + f"\n{row},,,,\n"
    rows = [r for r in audit(basis_params.reader.parse_table(text, "own.csv", "own")).rows if r.element == "He"]
    assert [(r.check, r.status) for r in rows] == [
        ("norm", "ok"),
        ("radius", "no reference"),
        ("energy", "no reference"),
    ]
