"""Bands, density of states and overlap population of crystals: true to the record, and legible."""

from dataclasses import replace

import numpy as np
import pytest
from scipy.integrate import trapezoid

from ehmo.calculate.crystal import CrystalOptions
from ehmo.calculate.crystal_report import crystal_report
from ehmo.errors import InputError
from ehmo.report.figures.canvas import figure_bytes
from ehmo.report.figures.crystal import band_figure
from ehmo.report.look import DARK, LIGHT
from ehmo.structure import crystal_contents
from tests.crystal.structures import REO3, V2O5
from tests.crystal.test_cluster import written
from tests.report.figures.boxes import outside, overlapping, words


def made(folder, crystal, mesh, path):
    contents = crystal_contents(written(folder, crystal))
    return crystal_report(contents, crystal=CrystalOptions(mesh=mesh, path=path))


@pytest.fixture(scope="module")
def v2o5(tmp_path_factory):
    return made(tmp_path_factory.mktemp("v2o5"), V2O5, (1, 2, 2), "auto")


@pytest.fixture(scope="module")
def reo3(tmp_path_factory):
    return made(tmp_path_factory.mktemp("reo3"), REO3, (3, 3, 3), "GXMG")


@pytest.fixture(scope="module")
def without_path(tmp_path_factory):
    return made(tmp_path_factory.mktemp("plain"), REO3, (3, 3, 3), None)


@pytest.mark.parametrize(("look", "width"), [(LIGHT, 8.4), (DARK, 17.4)])
def test_no_two_words_overlap(v2o5, reo3, without_path, look, width):
    for report in (v2o5, reo3, without_path):
        figure = band_figure(report, look=look, width_cm=width)
        assert overlapping(figure) == []
        assert outside(figure) == []


def test_bands_are_those_of_the_path_from_the_highest_filled_level(v2o5):
    axes = band_figure(v2o5).axes[1]
    curves = [line for line in axes.lines if len(line.get_xdata()) > 2]
    path = v2o5.bonding.path
    drawn = sum(len(line.get_ydata()) for line in curves)
    assert drawn == path.energies_eV.size
    wanted = np.sort((path.energies_eV - v2o5.bonding.gap.valence_eV).ravel())
    np.testing.assert_allclose(np.sort(np.concatenate([line.get_ydata() for line in curves])), wanted)


def test_zero_of_a_metal_is_its_fermi_level(reo3):
    curves = [line for line in band_figure(reo3).axes[1].lines if len(line.get_xdata()) > 2]
    wanted = reo3.bonding.path.energies_eV - reo3.bonding.state.filling.fermi_eV.max()
    np.testing.assert_allclose(curves[0].get_ydata(), wanted[:, 0])
    assert any("Fermi" in text for text, _ in words(band_figure(reo3)))


def test_filled_states_are_the_electrons_of_the_window(v2o5):
    """Law: the density of states up to the gap holds the electrons of the bands in the window."""
    figure = band_figure(v2o5)
    axes = figure.axes[2]
    parts = [line for line in axes.lines if line.get_gid() == "density"]
    energies = parts[0].get_ydata()
    filled = energies < v2o5.bonding.gap.gap_eV / 2
    total = sum(trapezoid(line.get_xdata()[filled], energies[filled]) for line in parts)
    levels = v2o5.bonding.state.energies_eV - v2o5.bonding.gap.valence_eV
    inside = (levels > axes.get_ylim()[0]) & (levels < v2o5.bonding.gap.gap_eV / 2)
    wanted = 2 * (v2o5.bonding.state.mesh.weights[:, None] * inside).sum()
    assert total == pytest.approx(wanted, rel=2e-3)


def test_overlap_population_integrates_to_that_of_the_bonds(v2o5):
    """Law: the filled part of the curve, the deep bands included, is the sum over the bonds of the cell."""
    lowest = float(v2o5.bonding.state.energies_eV.min() - v2o5.bonding.gap.valence_eV) - 2
    axes = band_figure(v2o5, (lowest, 5.0)).axes[3]
    curve = next(line for line in axes.lines if len(line.get_xdata()) > 2)
    energies = curve.get_ydata()
    filled = energies < v2o5.bonding.gap.gap_eV / 2
    total = trapezoid(curve.get_xdata()[filled], energies[filled])
    wanted = sum(v2o5.bonds_per_cell(unit) * order.overlap_population for unit, order in v2o5.bonds())
    assert total == pytest.approx(wanted, rel=2e-3)


def test_words_name_formula_gap_and_points(v2o5, reo3):
    said = [text for text, _ in words(band_figure(v2o5))]
    assert any("V_{2}O_{5}" in text for text in said)
    assert f"gap {v2o5.bonding.gap.gap_eV:.2f} eV" in " ".join(said)
    points = [text.get_text() for text in band_figure(reo3).axes[0].texts if text.get_gid() == "point"]
    assert points == ["Γ", "X", "M", "Γ"]


def test_bytes_are_the_same_again_and_no_window_is_refused(reo3):
    assert figure_bytes(band_figure(reo3), "svg") == figure_bytes(band_figure(reo3), "svg")
    with pytest.raises(InputError, match="no window"):
        band_figure(reo3, (2.0, -3.0))


def test_hostile_names_are_drawn_letter_by_letter(reo3):
    hostile = replace(reo3, networks=("layer $\\frac{1}{0}$<script>\x1b[31m",))
    svg = figure_bytes(band_figure(hostile), "svg").decode()
    assert "\x1b" not in svg
    assert "<script" not in svg
