"""The spread against whole calculations on drawn tables, and the laws that any standard deviation keeps."""

from __future__ import annotations

from dataclasses import replace
from functools import cache

import numpy as np
import pytest

import ehmo
from basis_params import ParameterTable, load_set
from ehmo.electronic import charges as charge_iteration
from ehmo.errors import ConvergenceError, InputError
from ehmo.studies.ensemble import Ensemble, Outcome
from ehmo.studies.spread import parameter_spread, spread_report
from tests.geometries import SPECIES
from tests.studies.exact_draws import Case, exact_draw

VANADYL = "[VO(OH2)5]2+"
SELF_CONSISTENT = ehmo.Options()
FIXED = ehmo.Options(charge_model="fixed")
CHANNELS = ehmo.Options(K_sigma=1.67, K_pi=2.0, K_decay_per_A=0.1)
STANDARD = load_set("standard")
SEED = 7


def with_deviations(
    table: ParameterTable, factor: float, *, exponents: bool = True, constants: bool = True
) -> ParameterTable:
    """Table whose standard deviations are those of `table` times a factor, or zero."""
    elements = {}
    for symbol, element in table.elements.items():
        shells = tuple(
            replace(
                shell,
                h_ii_sd_eV=factor * (shell.h_ii_sd_eV or 0.0),
                zeta_sd=factor * exponents * (shell.zeta_sd or 0.0),
            )
            for shell in element.shells
        )
        elements[symbol] = replace(element, shells=shells)
    sd = {key: factor * constants * value for key, value in table.settings.sd.items()}
    return replace(table, settings=replace(table.settings, sd=sd), elements=elements)


@cache
def case(name: str, options: ehmo.Options = SELF_CONSISTENT, table: ParameterTable = STANDARD) -> Case:
    return Case(ehmo.bond_report(SPECIES[name].fragment(), table, options), table, options)


def numbers_of(spread) -> np.ndarray:
    """All standard deviations in one array."""
    bonds = [(b.overlap_population, b.mayer, b.wiberg, *b.channel_weights) for b in spread.bonds]
    levels = [(level.energy_eV, level.above_lowest_per_cm / 8000) for ladder in spread.levels for level in ladder]
    bands = np.array([band for band in spread.bands_per_cm if band is not None]) / 8000
    parts = [spread.charges, spread.orbital_energies_eV, bands, *map(np.array, bonds), *map(np.array, levels)]
    return np.concatenate(parts)


# Draws against whole calculations


@pytest.mark.parametrize(
    ("name", "options"),
    [
        (VANADYL, SELF_CONSISTENT),
        (VANADYL, FIXED),
        ("VOCl3", CHANNELS),
        ("[UO2(OH2)5]2+", SELF_CONSISTENT),
        ("[FeO(OH2)5]2+", SELF_CONSISTENT),
    ],
)
def test_draws_of_h_ii_K_and_lambda_equal_whole_calculations(name, options, monkeypatch):
    # Both sides settle the charges to 1e-8; the whole calculation is driven further to be the reference.
    one = case(name, options, with_deviations(STANDARD, 1.0, exponents=False))
    steps = one.model.draws(4, SEED)
    results = Ensemble(one.report, one.table, one.model).results(steps)
    monkeypatch.setattr(charge_iteration, "CHARGE_TOLERANCE", 1e-11)
    assert (results.outcome == Outcome.USED).all()
    for draw, row in enumerate(steps):
        exact, orders = exact_draw(one, row), results.numbers.orders
        for bond, own in enumerate(exact.orders):
            assert orders.mayer[draw, bond] == pytest.approx(own.mayer, abs=1e-8)
            assert orders.wiberg[draw, bond] == pytest.approx(own.wiberg, abs=1e-8)
            assert orders.overlap_population[draw, bond] == pytest.approx(own.overlap_population, abs=1e-8)
        assert results.numbers.charges[draw] == pytest.approx(exact.populations.charges, abs=1e-8)
        assert results.numbers.energies_eV[draw] == pytest.approx(exact.state.energies_eV, abs=1e-6)


@pytest.mark.parametrize("name", [VANADYL, "[UO2(OH2)5]2+", "W(CCH3)(OCH3)3"])
@pytest.mark.parametrize("options", [SELF_CONSISTENT, CHANNELS], ids=["one K", "K by channel"])
def test_spread_of_ten_exact_draws_within_5_per_cent(name, options):
    one = case(name, options)
    steps = one.model.draws(10, SEED)
    numbers = Ensemble(one.report, one.table, one.model).results(steps).numbers
    exact = [exact_draw(one, row) for row in steps]
    pairs = [
        (numbers.orders.mayer, [[own.mayer for own in each.orders] for each in exact]),
        (numbers.orders.wiberg, [[own.wiberg for own in each.orders] for each in exact]),
        (numbers.orders.overlap_population, [[own.overlap_population for own in each.orders] for each in exact]),
        (numbers.charges, [each.populations.charges for each in exact]),
    ]
    for ours, whole in pairs:
        assert np.std(ours, axis=0, ddof=1) == pytest.approx(np.std(whole, axis=0, ddof=1), rel=0.05)
        # Not only the spread: every draw is closer to its own whole calculation than a twentieth of the spread.
        assert np.abs(ours - np.array(whole)).max() < 0.05 * np.std(whole, axis=0).max()


def test_exponents_alone_are_drawn_exactly_enough():
    # With everything else sure, nothing hides the error of the interpolated overlaps.
    one = case(VANADYL, FIXED)
    zeta = np.array([entry.kind == "zeta" for entry in one.model.entries])
    steps = np.where(zeta, one.model.draws(10, SEED), 0.0)
    ours = Ensemble(one.report, one.table, one.model).results(steps).numbers.orders.mayer
    whole = np.array([[own.mayer for own in exact_draw(one, row).orders] for row in steps])
    assert np.std(ours, axis=0) == pytest.approx(np.std(whole, axis=0), rel=0.05)
    assert np.std(whole, axis=0).min() > 1e-3


@pytest.mark.parametrize("name", [VANADYL, "[CrO(OH2)5]2+", "PuO2 2+", "[Co(NH3)5(NO)]2+"])
def test_no_step_gives_back_the_report(name):
    one = case(name)
    still = np.zeros((1, len(one.model.entries)))
    numbers = Ensemble(one.report, one.table, one.model, (3, 5)).results(still).numbers
    assert numbers.charges[0] == pytest.approx(one.report.populations.charges, abs=1e-7)
    assert numbers.energies_eV[0] == pytest.approx(one.report.state.energies_eV, abs=1e-6)
    assert numbers.followed_eV[0] == pytest.approx(one.report.state.energies_eV[[3, 5]], abs=1e-6)
    for bond, orders in enumerate(one.report.orders):
        assert numbers.orders.mayer[0, bond] == pytest.approx(orders.mayer, abs=1e-7)
        weights = [channel.weight for channel in orders.channels]
        assert numbers.orders.channel_weights[bond][0] == pytest.approx(weights, abs=1e-6)
    (ladder,), (site,) = numbers.ladders, one.report.sites
    assert ladder.energies_eV[0] == pytest.approx([level.energy_eV for level in site.ladder.levels], abs=1e-6)
    assert ladder.metal_shares[0] == pytest.approx([level.metal_share for level in site.ladder.levels], abs=1e-5)
    assert ladder.electrons[0] == pytest.approx([level.electrons for level in site.ladder.levels], abs=1e-6)
    assert ladder.field_eV[0] == pytest.approx(site.ladder.field_eV, abs=1e-5)
    assert ladder.same_filling.all()


@pytest.mark.parametrize("name", [VANADYL, "[V(OH2)6]3+", "[Ni(OH2)6]2+", "NpO2 2+"])
def test_bands_follow_whole_calculations(name):
    # Small steps, so that no terms cross and both sides list the same bands.
    table = with_deviations(STANDARD, 0.05, exponents=False)
    one = case(name, SELF_CONSISTENT, table)
    spread = parameter_spread(one.report, table, one.options, draws=3, seed=SEED)
    drawn = []
    for row in one.model.draws(3, SEED):
        own = exact_table(one, row)
        drawn.append(ehmo.bond_report(one.report.fragment, own, one.options).spectroscopy.bands)
    bands = one.report.spectroscopy.bands
    assert bands
    for place, band in enumerate(bands):
        if band.kind == "charge transfer":
            continue
        alike = [[b for b in other if b.upper_term == band.upper_term] for other in (bands, *drawn)]
        rank = [id(b) for b in alike[0]].index(id(band))
        whole = [other[rank].wavenumber_per_cm for other in alike[1:]]
        assert spread.bands_per_cm[place] == pytest.approx(np.std(whole, ddof=1), rel=2e-3, abs=0.02)


def exact_table(one: Case, row: np.ndarray) -> ParameterTable:
    """Table of one draw of h_ii, K and lambda."""
    steps = dict(zip((p.name for p in one.model.parameters), row, strict=True))
    sds = {p.name: p.sd for p in one.model.parameters}
    elements = {}
    for symbol, element in one.table.elements.items():
        shells = []
        for shell in element.shells:
            key = f"{symbol} {shell.label} h_ii"
            shells.append(replace(shell, h_ii_eV=shell.h_ii_eV + sds.get(key, 0.0) * steps.get(key, 0.0)))
        elements[symbol] = replace(element, shells=tuple(shells))
    settings = one.table.settings
    settings = replace(
        settings,
        K=settings.K + sds["K"] * steps["K"],
        lambda_=settings.lambda_ + sds["lambda"] * steps["lambda"],
    )
    return replace(one.table, settings=settings, elements=elements)


def test_charge_transfer_bands_are_gaps_of_the_drawn_orbitals():
    table = with_deviations(STANDARD, 0.05, exponents=False)
    one = case("MnO4 -", SELF_CONSISTENT, table)
    spread = parameter_spread(one.report, table, one.options, draws=4, seed=SEED)
    steps = one.model.draws(4, SEED)
    energies = np.array([exact_draw(one, row).state.energies_eV for row in steps])
    for band, deviation in zip(one.report.spectroscopy.bands, spread.bands_per_cm, strict=True):
        lower, upper = band.orbitals
        gaps = (energies[:, upper] - energies[:, lower]) * 8065.543937
        assert deviation == pytest.approx(np.std(gaps, ddof=1), rel=1e-4)


def test_sensitivity_is_the_central_difference_of_whole_calculations():
    one = case(VANADYL)
    spread = parameter_spread(one.report, one.table, one.options, draws=2)
    names = [parameter.name for parameter in one.model.parameters]
    found = {effect.parameter: effect.mayer_per_sd for effect in spread.bonds[0].sensitivity}
    assert list(found.values()) == sorted(found.values(), key=abs, reverse=True)
    assert set(found) == set(names)
    for name, tolerance in (("V 3d h_ii", 1e-7), ("lambda", 1e-7), ("K", 1e-7), ("O 2p zeta", 1e-4)):
        step = np.eye(len(names))[names.index(name)]
        up, down = (exact_draw(one, sign * step).orders[0].mayer for sign in (1, -1))
        assert found[name] == pytest.approx((up - down) / 2, abs=tolerance)


# Laws


@pytest.mark.parametrize("options", [SELF_CONSISTENT, FIXED], ids=["self-consistent", "fixed"])
def test_no_uncertainty_no_spread(options):
    table = with_deviations(STANDARD, 0.0)
    one = case("VOCl3", options, table)
    spread = parameter_spread(one.report, table, options, draws=3)
    assert spread.parameters == ()
    assert np.abs(numbers_of(spread)).max() < 1e-12
    assert spread.bonds[0].sensitivity == ()


@pytest.mark.parametrize("name", ["VOCl3", "[VOCl4]2-"])
def test_spread_grows_in_proportion_to_small_uncertainties(name):
    single, double = (with_deviations(STANDARD, factor) for factor in (0.01, 0.02))
    spreads = [
        numbers_of(parameter_spread(case(name, SELF_CONSISTENT, t).report, t, SELF_CONSISTENT, draws=8))
        for t in (single, double)
    ]
    noise = 1e-6  # charges settle to 1e-8 only
    large = spreads[0] > 1e3 * noise
    assert large.sum() > 20
    assert spreads[1][large] == pytest.approx(2 * spreads[0][large], rel=0.03)


def test_same_seed_same_spread():
    one = case("VOCl3")
    first, again, other = (
        numbers_of(parameter_spread(one.report, one.table, one.options, draws=6, seed=seed)) for seed in (3, 3, 4)
    )
    assert np.array_equal(first, again)
    assert not np.allclose(first, other, rtol=1e-3)


def test_equivalent_bonds_have_equal_spreads():
    bonds = parameter_spread(case("MnO4 -").report, STANDARD, SELF_CONSISTENT, draws=8).bonds
    assert len(bonds) == 4
    for bond in bonds[1:]:
        assert bond.mayer == pytest.approx(bonds[0].mayer, rel=1e-6)
        assert bond.channel_weights == pytest.approx(bonds[0].channel_weights, rel=1e-5)


def test_charges_of_every_draw_add_up():
    one = case(VANADYL)
    numbers = Ensemble(one.report, one.table, one.model).results(one.model.draws(6, SEED)).numbers
    assert numbers.charges.sum(axis=1) == pytest.approx(2.0, abs=1e-9)


def test_work_in_small_lots_changes_nothing(monkeypatch):
    one = case("VOCl3")
    steps = one.model.draws(7, SEED)
    steps[::2] = np.where([entry.kind == "zeta" for entry in one.model.entries], 0.0, steps[::2])
    whole = Ensemble(one.report, one.table, one.model).results(steps)
    monkeypatch.setattr("ehmo.studies.ensemble._NUMBERS_AT_ONCE", 1)
    parts = Ensemble(one.report, one.table, one.model).results(steps)
    assert parts.numbers.orders.mayer == pytest.approx(whole.numbers.orders.mayer, abs=1e-12)
    assert parts.numbers.ladders[0].energies_eV == pytest.approx(whole.numbers.ladders[0].energies_eV, abs=1e-10)


# Draws that do not count


def test_indefinite_overlap_is_counted_and_left_out():
    # Exponents that may halve or double leave no positive definite matrix now and then.
    elements = {
        symbol: replace(element, shells=tuple(replace(s, zeta_sd=0.7 * min(s.zetas)) for s in element.shells))
        for symbol, element in STANDARD.elements.items()
    }
    table = replace(STANDARD, elements=elements)
    report = spread_report(SPECIES["VOCl3"].fragment(), table, FIXED, draws=30, seed=SEED)
    spread = report.spread
    assert spread.indefinite_overlap > 3
    assert spread.used + spread.indefinite_overlap + spread.unsettled + spread.other_configuration == 30
    assert any("draws of the parameters" in warning for warning in report.warnings)


def test_another_filling_of_the_ladder_is_counted_and_left_out():
    one = case("[PuO2(OH2)5]2+", FIXED)
    steps = one.model.draws(64, 20_261_201)
    results = Ensemble(one.report, one.table, one.model).results(steps)
    other = np.flatnonzero(results.outcome == Outcome.OTHER_CONFIGURATION)
    assert len(other) > 0
    # By a whole calculation: electrons in the space of each undrawn ladder orbital, Löwdin functions of both.
    report = one.report
    space = list(report.sites[0].ladder.orbitals)
    undrawn = root(report.overlap) @ report.state.coefficients[:, space]
    before = report.state.occupations.sum(axis=0)[space]
    moved = []
    for row in steps:
        exact = exact_draw(one, row)
        alike = (undrawn.T @ root(exact.overlap.matrix) @ exact.state.coefficients) ** 2
        moved.append(np.abs(alike @ exact.state.occupations.sum(axis=0) - before).max())
    assert min(moved[draw] for draw in other) > max(m for draw, m in enumerate(moved) if draw not in other)


def root(matrix: np.ndarray) -> np.ndarray:
    values, vectors = np.linalg.eigh(matrix)
    return (vectors * np.sqrt(values)) @ vectors.T


def test_no_usable_draw_is_an_error(monkeypatch):
    monkeypatch.setattr("ehmo.studies.ensemble.SMALLEST_OVERLAP_EIGENVALUE", 10.0)
    with pytest.raises(ConvergenceError, match="no draw of the parameters"):
        Ensemble(case("VOCl3").report, STANDARD, case("VOCl3").model).results(case("VOCl3").model.draws(2, SEED))


def test_exponent_less_certain_than_itself_is_refused():
    vanadium = STANDARD.element("V")
    shells = tuple(replace(shell, zeta_sd=2.0 if shell.l == 2 else None) for shell in vanadium.shells)
    table = replace(STANDARD, elements={**STANDARD.elements, "V": replace(vanadium, shells=shells)})
    with pytest.raises(InputError, match="V 3d"):
        spread_report(SPECIES["VOCl3"].fragment(), table, FIXED, draws=2)


# Input


@pytest.mark.parametrize("draws", [-1, 0, 1, 10**9])
def test_number_of_draws_is_checked(draws):
    with pytest.raises(InputError, match="draws"):
        spread_report(SPECIES["VOCl3"].fragment(), draws=draws)


def test_table_must_be_that_of_the_report():
    with pytest.raises(InputError, match="not with the table"):
        parameter_spread(case("VOCl3").report, with_deviations(STANDARD, 0.5), SELF_CONSISTENT)


def test_report_without_spread_says_nothing_of_it():
    report = case("VOCl3").report
    assert report.spread is None
    assert "±" not in str(report)


def test_report_with_spread_shows_it():
    report = spread_report(SPECIES["VOCl3"].fragment(), draws=4)
    deviation = report.spread.bonds[0].mayer
    assert f"{report.orders[0].mayer:.2f} ± {deviation:.2f}" in str(report)


def test_two_metals_have_two_ladders():
    # A linear oxo bridge between two titanium chlorides, lengths as in TiCl4 and a bridging oxide (common practice).
    turned = np.array([[1, 0], [-0.5, 0.866], [-0.5, -0.866]]) * 2.08
    positions = [[0, 0, 1.8], [0, 0, 0], [0, 0, -1.8]]
    positions += [[x, y, 1.8 + 0.6] for x, y in turned] + [[x, y, -1.8 - 0.6] for x, y in turned]
    fragment = ehmo.Fragment(("Ti", "O", "Ti", *["Cl"] * 6), positions, 0, 0)
    report = spread_report(fragment, draws=4)
    assert len(report.spread.levels) == 2
    first, second = ([level.energy_eV for level in ladder] for ladder in report.spread.levels)
    assert len(first) == 5
    assert first == pytest.approx(second, rel=1e-4)
    assert report.level_spreads(report.sites[1]) is report.spread.levels[1]
