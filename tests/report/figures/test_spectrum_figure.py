"""The spectrum: sticks, envelope and marks true to the record."""

import numpy as np
import pytest
from matplotlib.colors import to_hex
from scipy import constants
from scipy.integrate import trapezoid

from ehmo.errors import InputError
from ehmo.report.figures.spectrum import LAST_PER_CM, absorptivity, spectrum_figure
from ehmo.report.look import DARK, LIGHT
from ehmo.units import STRENGTH_PER_ABSORPTIVITY
from tests.report.figures.boxes import outside, overlapping
from tests.report.figures.reports import SIMPLE_TO_CROWDED, report

VANADYL = ("[VO(OH2)5]2+", (13000.0, 16000.0))


def test_strength_per_absorptivity_is_that_of_the_constants():
    """Law: f = 4 eps0 m c^2 ln 10 / (N e^2) times the integral; L mol^-1 cm^-2 to m mol^-1 is a factor of ten."""
    wanted = 4 * constants.epsilon_0 * constants.m_e * constants.c**2 * np.log(10) / (constants.N_A * constants.e**2)
    assert pytest.approx(10 * wanted, rel=1e-8) == STRENGTH_PER_ABSORPTIVITY


def test_a_band_has_the_area_of_its_strength():
    nu = np.linspace(-30_000, 30_000, 20_001)
    curve = absorptivity(0.3, 3000.0) * np.exp(-4 * np.log(2) * (nu / 3000.0) ** 2)
    assert STRENGTH_PER_ABSORPTIVITY * trapezoid(curve, nu) == pytest.approx(0.3, rel=1e-6)


@pytest.mark.parametrize("name", [name for name in SIMPLE_TO_CROWDED if name != "UO2 2+"])
def test_no_two_words_overlap(name):
    figure = spectrum_figure(report(name))
    assert overlapping(figure) == []
    assert outside(figure) == []


@pytest.mark.parametrize("look", [LIGHT, DARK])
def test_sticks_are_the_bands_with_a_strength(look):
    found = report("MnO4 -")
    axes = spectrum_figure(found, look=look).axes[1]
    sticks = [line for line in axes.lines if line.get_gid() == "stick"]
    wanted = [
        (band.wavenumber_per_cm / 1000, absorptivity(band.oscillator_strength, 3000.0))
        for band in found.spectroscopy.bands
        if band.oscillator_strength and absorptivity(band.oscillator_strength, 3000.0) > 1
        if band.wavenumber_per_cm <= LAST_PER_CM
    ]
    assert len(sticks) == len(wanted) > 3
    for line, (x, height) in zip(sticks, wanted, strict=True):
        assert line.get_xdata() == pytest.approx([x, x])
        assert line.get_ydata()[1] == pytest.approx(height)
        assert to_hex(line.get_color()) == look.donor


def test_envelope_is_the_sum_of_the_bands():
    found = report("MnO4 -")
    line = next(line for line in spectrum_figure(found).axes[1].lines if line.get_gid() == "envelope")
    nu, drawn = 1000 * line.get_xdata(), line.get_ydata()
    total = sum(
        absorptivity(band.oscillator_strength or 0, 3000.0)
        * np.exp(-4 * np.log(2) * ((nu - band.wavenumber_per_cm) / 3000.0) ** 2)
        for band in found.spectroscopy.bands
        if band.wavenumber_per_cm <= LAST_PER_CM
    )
    np.testing.assert_allclose(drawn, np.maximum(total, 1.0), rtol=1e-6)


def test_observed_bands_and_those_without_intensity_are_marked():
    axes = spectrum_figure(report(*VANADYL), (30_000.0,)).axes[1]
    marked = [line.get_xdata()[0] for line in axes.lines if line.get_gid() == "observed"]
    assert marked == pytest.approx([13, 16, 30])
    hollow = [line.get_xdata()[0] for line in axes.lines if line.get_gid() == "no intensity"]
    wanted = [
        band.wavenumber_per_cm / 1000
        for band in report(*VANADYL).spectroscopy.bands
        if band.kind == "d-d" and band.oscillator_strength is None
    ]
    assert hollow == pytest.approx(wanted)
    assert len(hollow) == 2


def test_spin_forbidden_bands_are_ticks():
    found = report("[FeO(OH2)5]2+")
    axes = spectrum_figure(found).axes[1]
    ticks = [line.get_xdata()[0] for line in axes.lines if line.get_gid() == "spin-forbidden"]
    wanted = [b.wavenumber_per_cm / 1000 for b in found.spectroscopy.bands if not b.spin_allowed]
    assert ticks == pytest.approx([x for x in wanted if 0 < x <= LAST_PER_CM / 1000])


def test_a_report_without_bands_is_refused():
    from dataclasses import replace

    plain = report("VOCl3")
    bare = replace(plain, spectroscopy=replace(plain.spectroscopy, bands=(), withheld=("several metals",)))
    with pytest.raises(InputError, match="several metals"):
        spectrum_figure(bare)
