"""Which parameters are drawn, how far, and which of them move together."""

from __future__ import annotations

from dataclasses import replace

import numpy as np
import pytest

import ehmo
from basis_params import load_set
from ehmo.orbitals.pairs import build_basis
from ehmo.studies.uncertainty import DEFAULT_ZETA_SD, ParameterModel, parameter_model

STANDARD = load_set("standard")


def model(symbols: tuple[str, ...], table=STANDARD, settings=None, *, self_consistent: bool = True) -> ParameterModel:
    return parameter_model(
        build_basis(symbols, table), table, settings or table.settings, self_consistent=self_consistent
    )


def bare(table):
    """Table that states no standard deviation."""
    elements = {
        symbol: replace(element, shells=tuple(replace(s, h_ii_sd_eV=None, zeta_sd=None) for s in element.shells))
        for symbol, element in table.elements.items()
    }
    return replace(table, settings=replace(table.settings, sd={}), elements=elements)


def test_every_parameter_of_the_elements_and_the_hamiltonian_is_drawn():
    names = [parameter.name for parameter in model(("V", "O", "O")).parameters]
    assert names == [
        *("V 4s h_ii", "V 4p h_ii", "V 3d h_ii", "V 4s zeta", "V 4p zeta", "V 3d zeta"),
        *("O 2s h_ii", "O 2p h_ii", "O 2s zeta", "O 2p zeta", "K", "lambda"),
    ]


def test_lambda_is_sure_where_charges_are_fixed():
    assert "lambda" not in [p.name for p in model(("V", "O"), self_consistent=False).parameters]


def test_K_of_a_channel_is_a_parameter_of_its_own():
    settings = replace(STANDARD.settings, K_sigma=1.67, K_pi=2.0)
    chosen = model(("V", "O"), settings=settings)
    assert {"K", "K_sigma", "K_pi"} <= {p.name for p in chosen.parameters}
    steps = np.zeros((1, len(chosen.entries)))
    place = [p.name for p in chosen.parameters].index("K_pi")
    steps[0, place] = 2.0
    assert chosen.constants(steps)["K"][0] == pytest.approx([1.67, 2.0 + 2 * 0.05, 1.75, 1.75])


def test_K_of_all_channels_moves_with_K():
    chosen = model(("V", "O"))
    steps = np.zeros((1, len(chosen.entries)))
    steps[0, [p.name for p in chosen.parameters].index("K")] = -1.0
    assert chosen.constants(steps)["K"][0] == pytest.approx(4 * [1.75 - STANDARD.settings.sd["K"]])


def test_stated_deviations_are_taken_and_missing_ones_replaced_by_the_usual_ones():
    stated, usual = model(("V", "O")).parameters, model(("V", "O"), bare(STANDARD)).parameters
    assert all(p.stated for p in stated)
    assert not any(p.stated for p in usual)
    # The shipped set states the usual ones, rounded.
    for one, other in zip(stated, usual, strict=True):
        assert one.sd == pytest.approx(other.sd, abs=6e-4)
    by_name = {p.name: p for p in usual}
    assert (by_name["V 3d h_ii"].sd, by_name["O 2p h_ii"].sd) == (0.8, 0.5)
    assert by_name["O 2p zeta"].sd == pytest.approx(DEFAULT_ZETA_SD * 2.275)
    assert by_name["V 3d zeta"].value == 1.7  # the outer exponent of two


def test_every_row_of_the_shipped_set_states_both_deviations():
    for element in STANDARD.elements.values():
        for shell in element.shells:
            assert shell.h_ii_sd_eV == (0.5 if shell.l < 2 else 0.8)
            assert shell.zeta_sd == pytest.approx(0.03 * min(shell.zetas), abs=6e-4)
    assert set(STANDARD.settings.sd) == {"K", "lambda"}


def test_shells_of_one_l_share_their_exponent_step():
    chosen = model(("U", "O"))
    place = [p.name for p in chosen.parameters].index("U 6p 7p zeta")
    steps = np.zeros((1, len(chosen.entries)))
    steps[0, place] = 1.0
    assert chosen.exponent_steps(steps).sum() == 2  # 6p and 7p, nothing else


def test_draws_have_the_stated_correlations():
    chosen = model(("V", "O"))
    names = [p.name for p in chosen.parameters]
    matrix = np.corrcoef(chosen.draws(40_000, 5).T)
    variances = chosen.draws(40_000, 5).var(axis=0)
    assert variances == pytest.approx(1.0, abs=0.03)
    for i, first in enumerate(names):
        for j, second in enumerate(names[:i]):
            same_element = first.split()[0] == second.split()[0] and " " in first
            same_kind = first.split()[-1] == second.split()[-1]
            expected = 0.5 if same_element and same_kind else 0.0
            assert matrix[i, j] == pytest.approx(expected, abs=0.025), (first, second)


def test_steps_are_standard_deviations():
    chosen = model(("V", "O"))
    steps = np.zeros((2, len(chosen.entries)))
    place = [p.name for p in chosen.parameters].index("V 3d h_ii")
    steps[1, place] = 1.5
    difference = np.diff(chosen.h_ii_eV(steps), axis=0)[0]
    assert sorted(difference)[-1] == pytest.approx(1.5 * 0.8)
    assert np.count_nonzero(difference) == 1


def test_far_draws_keep_the_sign_of_h_ii_and_no_negative_constant():
    chosen = model(("V", "O"))
    steps = np.full((1, len(chosen.entries)), 1000.0)
    assert (chosen.h_ii_eV(steps) < 0).all()
    assert min(chosen.constants(-steps)["lambda"].min(), chosen.constants(-steps)["K"].min()) == 0


def test_decay_is_drawn_only_where_its_deviation_is_stated():
    settings = replace(STANDARD.settings, K_decay_per_A=0.2)
    assert "K_decay_per_A" not in [p.name for p in model(("V", "O"), settings=settings).parameters]
    settings = replace(settings, sd={**settings.sd, "K_decay_per_A": 0.05})
    assert "K_decay_per_A" in [p.name for p in model(("V", "O"), settings=settings).parameters]


def test_user_table_with_deviations_is_read(tmp_path):
    path = tmp_path / "own.csv"
    path.write_text(
        "# lambda = 0.9\n# lambda_sd = 0.3\n"
        "element,valence_electrons,n,l,h_ii_eV,zeta1,c1,zeta2,c2,source_key,locator,read_or_memory,h_ii_sd_eV,zeta_sd\n"
        "O,6,2,s,-32.3,2.275,,,,own,x,memory,1.5,0.2\nO,6,2,p,-14.8,2.275,,,,own,x,memory,,\n"
        "Ti,2,4,s,-8.97,1.075,,,,own,x,memory,,\n"
    )
    from basis_params import load

    found = {p.name: p for p in model(("Ti", "O"), load(path)).parameters}
    assert (found["O 2s h_ii"].sd, found["O 2s zeta"].sd, found["lambda"].sd) == (1.5, 0.2, 0.3)
    assert found["O 2s h_ii"].stated
    assert found["lambda"].stated
    assert not found["O 2p h_ii"].stated
    assert ehmo.Options().charge_model == "self-consistent"
