"""The interaction diagram: legible from 5 to 60 levels, and true to its record."""

from functools import cache

import numpy as np
import pytest
from matplotlib.colors import to_hex

from ehmo import Fragment, bond_report
from ehmo.analysis.interaction import bond_interaction
from ehmo.errors import InputError
from ehmo.report.figures import interaction as module
from ehmo.report.figures.interaction import default_bond, interaction_diagram
from ehmo.report.look import DARK, LIGHT
from tests.geometries import SPECIES
from tests.report.figures.boxes import outside, overlapping, words

SIMPLE_TO_CROWDED = (
    "UO2 2+", "VOCl3", "MnO4 -", "CrO2Cl2", "[VO(OH2)5]2+", "[FeO(OH2)5]2+", "[UO2(OH2)5]2+", "V(NC6H5)Cl3",
    "W(CCH3)(OCH3)3", "Cr(CO)6", "[Co(NH3)5(NO)]2+", "[MoOCl5]2-",
)  # fmt: skip


@cache
def report(name):
    return bond_report(SPECIES[name].fragment())


@pytest.mark.parametrize("name", SIMPLE_TO_CROWDED)
def test_no_two_words_overlap(name):
    figure = interaction_diagram(report(name))
    assert overlapping(figure) == []
    assert outside(figure) == []


def crowd():
    """Four vanadyl ions far from one another: over 80 levels of the oxygens, none with an irrep."""
    one = SPECIES["[VO(OH2)5]2+"]
    positions = np.concatenate([(1 + 0.004 * k) * one.positions_A + np.array([40.0 * k, 0, 0]) for k in range(4)])
    return bond_report(Fragment(one.symbols * 4, positions, 8, 4))


def test_sixty_levels(monkeypatch):
    monkeypatch.setattr(module, "OWN_SHARE", -1.0)
    crowded = crowd()
    figure = interaction_diagram(crowded)
    labels = [text for text in figure.axes[0].texts if text.get_gid() == "label set"]
    assert len(labels) == module.MOST_SETS
    assert overlapping(figure) == []
    assert outside(figure) == []
    assert figure.get_size_inches()[1] * 2.54 <= 22.001


def test_electrons_drawn_are_those_of_the_levels():
    """Law: one half arrow for each electron of the levels that are drawn."""
    for name in ("VOCl3", "[FeO(OH2)5]2+", "MnO4 -"):
        found = bond_interaction(report(name), default_bond(report(name)))
        for look in (LIGHT, DARK):
            axes = interaction_diagram(report(name), look=look).axes[0]
            arrows = [line for line in axes.lines if len(line.get_xdata()) == 3]
            up = [line for line in arrows if to_hex(line.get_color()) == look.alpha]
            down = [line for line in arrows if to_hex(line.get_color()) == look.beta]
            shown = {text.get_text() for text in axes.texts if text.get_gid() == "label set"}
            drawn = [s for s in found.sets if s.metal_share + s.donor_share >= module.OWN_SHARE]
            assert shown
            assert len(up) == round(sum(s.alpha for s in drawn))
            assert len(down) == round(sum(s.beta for s in drawn))
            assert all(line.get_ydata()[1] > line.get_ydata()[0] for line in up)
            assert all(line.get_ydata()[1] < line.get_ydata()[0] for line in down)


def test_lines_are_the_contributions():
    """Law: one line for each contribution of a drawn level to a drawn orbital, as wide as the contribution."""
    found = bond_interaction(report("MnO4 -"), 0)
    axes = interaction_diagram(report("MnO4 -")).axes[0]
    top = max(level.energy_eV for level in found.sets if level.energy_eV < 5)
    wanted = sorted(
        0.3 + 1.2 * share
        for levels, shares in (
            (found.metal_levels, found.metal_contributions),
            (found.ligand_levels, found.ligand_contributions),
        )
        for s, row in zip(found.sets, shares, strict=True)
        for level, share in zip(levels, row, strict=True)
        if share >= module.LINE_SHARE and s.energy_eV <= top and level.energy_eV <= top + 1
    )
    widths = sorted(line.get_linewidth() for line in axes.lines if line.get_alpha() == 0.8)
    np.testing.assert_allclose(widths, wanted, atol=1e-9)


def test_labels_name_irreps_and_parts():
    texts = [text for text, _ in words(interaction_diagram(report("MnO4 -")))]
    assert r"$2\mathrm{e}$ π*" in texts
    assert r"$1\mathrm{t}_{\mathrm{1}}$" in texts
    assert "4 oxo" in texts
    assert r"$\mathrm{MnO_{4}^{-}}$" in texts


def test_the_bond_can_be_chosen():
    chlorido = next(
        k for k, b in enumerate(report("VOCl3").coordination.bonds) if report("VOCl3").fragment.symbols[b.donor] == "Cl"
    )
    texts = [text for text, _ in words(interaction_diagram(report("VOCl3"), chlorido))]
    assert "3 halide" in texts
    with pytest.raises(InputError, match="no bond number 9"):
        interaction_diagram(report("VOCl3"), 9)


def test_levels_of_a_large_ion_are_labelled_in_its_group_and_joined():
    """Two tetrahedra that share an oxygen, D3d: no orbital has much of one metal."""
    one = SPECIES["CrO4 2-"]
    turned = one.positions_A - one.positions_A[1]
    both = np.concatenate([turned, -turned[[0, 2, 3, 4]]])
    ion = bond_report(Fragment((*one.symbols, *(one.symbols[k] for k in (0, 2, 3, 4))), both, -2, 0))
    assert ion.irreps is None
    figure = interaction_diagram(ion)
    assert overlapping(figure) == []
    labels = " ".join(text.get_text() for text in figure.axes[0].texts if text.get_gid() == "label set")
    assert r"\mathrm{e}_{\mathrm{u}}" in labels
    assert r"\mathrm{a}_{\mathrm{1g}}" in labels
    assert len([line for line in figure.axes[0].lines if line.get_alpha() == 0.8]) > 10
