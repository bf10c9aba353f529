"""The main job on the species it is for: orbitals of aqua vanadyl, ranking, multiple and single bonds."""

from __future__ import annotations

from functools import cache

import numpy as np
import pytest

from ehmo import Fragment, bond_report
from ehmo.analysis.local_frame import local_gross_populations
from ehmo.electronic.charges import CHARGE_TOLERANCE
from ehmo.records.bonding import BondChannel
from ehmo.records.coordination import DonorKind
from ehmo.records.report import BondReport
from tests.geometries import SPECIES

VANADYL = "[VO(OH2)5]2+"
FULL = 0.6
ITERATIONS_ALLOWED = 40

OXO_SPECIES = (
    VANADYL,
    "VOCl3",
    "MnO4 -",
    "FeO4 2-",
    "CrO2Cl2",
    "[FeO(OH2)5]2+",
    "UO2 2+",
    "NpO2 2+",
    "PuO2 2+",
    "[UO2(OH2)5]2+",
    "[NpO2(OH2)5]2+",
    "[PuO2(OH2)5]2+",
)
TETRAOXO_D0 = ("VO4 3-", "CrO4 2-", "MnO4 -", "MoO4 2-", "TcO4 -", "RuO4", "WO4 2-", "ReO4 -", "OsO4")
OTHER_MULTIPLE = {
    "[MoNCl4]-": DonorKind.NITRIDO,
    "[CrNCl4]2-": DonorKind.NITRIDO,
    "[RuNCl4]-": DonorKind.NITRIDO,
    "V(NH)Cl3": DonorKind.IMIDO_LINEAR,
    "V(NC6H5)Cl3": DonorKind.IMIDO_LINEAR,
    "MoO(NCH3)Cl2, bent": DonorKind.IMIDO_BENT,
    "VO(OCH3)3": DonorKind.ALKOXO,
    "Ti(OCH3)4": DonorKind.ALKOXO,
    "Ti(NMe2)Cl3": DonorKind.AMIDO,
    "Ti(NMe2)4": DonorKind.AMIDO,
    "Ta(CH2)Cl3": DonorKind.CARBENE,
    "Cr(CO)5(C(OMe)Me)": DonorKind.CARBENE,
    "W(CCH3)(OCH3)3": DonorKind.CARBYNE,
    "W(CH)Cl3": DonorKind.CARBYNE,
    "MoS4 2-": DonorKind.SULFIDO,
}
HEXAAQUA = tuple(name for name in SPECIES if "(OH2)6]" in name)
CONTROLS = {
    "Cr(CO)6": DonorKind.CARBONYL,
    "[Fe(CN)5(NO)]2-": DonorKind.NITROSYL_LINEAR,
    "[Co(NH3)5(NO)]2+": DonorKind.NITROSYL_BENT,
    "TiCl4": DonorKind.HALIDE,
    "[CoCl4]2-": DonorKind.HALIDE,
    "[TiF6]2-": DonorKind.HALIDE,
    "[Co(NH3)6]3+": DonorKind.AMINE,
    VANADYL: DonorKind.AQUA,
    **dict.fromkeys(HEXAAQUA, DonorKind.AQUA),
}
EVERY_NAME = tuple(dict.fromkeys((*OXO_SPECIES, *TETRAOXO_D0, *OTHER_MULTIPLE, *CONTROLS)))


@cache
def report_on(name: str) -> BondReport:
    return bond_report(SPECIES[name].fragment())


def orders_by_kind(name: str, kind: DonorKind):
    return [orders for bond, orders in report_on(name).bonds() if bond.kind == kind]


def channels(orders, kind: str) -> list[BondChannel]:
    return [channel for channel in orders.channels if channel.type == kind]


# Every species.


@pytest.mark.parametrize("name", EVERY_NAME)
def test_species_runs_converges_and_keeps_its_electrons(name):
    species, report = SPECIES[name], report_on(name)
    assert report.method.charge_model == "self-consistent"
    assert report.method.iterations <= ITERATIONS_ALLOWED
    electrons = report.basis.core_charges.sum() - species.charge
    assert report.state.occupations.sum() == pytest.approx(electrons, abs=1e-9)
    assert report.populations.spin.sum() == pytest.approx(species.unpaired_electrons, abs=1e-9)
    assert report.populations.charges.sum() == pytest.approx(species.charge, abs=1e-9)
    for _, orders in report.bonds():
        assert orders.mayer > 0.2
        assert orders.overlap_population > 0.05
        assert orders.wiberg < 3.5


# A degenerate level that is partly filled, or unpaired density that is as much on oxygen as on the metal (ferrate(VI)).
DEGENERATE = {
    "NpO2 2+",
    "PuO2 2+",
    "[NpO2(OH2)5]2+",
    "[Ti(OH2)6]3+",
    "[V(OH2)6]3+",
    "[Fe(OH2)6]2+",
    "[Co(OH2)6]2+",
}
# Or a ladder so wide that its lowest term has another spin than the ion.
TOO_WIDE = {"[Mn(OH2)6]2+", "[Fe(OH2)6]3+", "[FeO(OH2)5]2+"}
MAY_WARN = DEGENERATE | TOO_WIDE | {"FeO4 2-", "[PuO2(OH2)5]2+", "[CoCl4]2-"}


@pytest.mark.parametrize("name", EVERY_NAME)
def test_warnings_are_given_where_there_is_something_to_doubt(name):
    warnings = report_on(name).warnings
    if name in DEGENERATE:
        assert any("degenerate" in warning for warning in warnings)
    elif name not in MAY_WARN:
        assert [warning for warning in warnings if "bond-valence sum" not in warning] == []


def shaken(name: str, amplitude_A: float) -> Fragment:
    """A species with every coordinate off by a little, as in a measured structure."""
    species = SPECIES[name]
    noise = np.random.default_rng(0).normal(size=species.positions_A.shape) * amplitude_A
    return Fragment(species.symbols, species.positions_A + noise, species.charge, species.unpaired_electrons)


@pytest.mark.parametrize("name", [name for name in EVERY_NAME if name not in HEXAAQUA])
def test_slightly_irregular_geometries_converge_as_well_and_say_nearly_the_same(name):
    report = bond_report(shaken(name, 1e-3))
    assert report.method.iterations <= ITERATIONS_ALLOWED
    regular = {(bond.metal, bond.donor): orders.mayer for bond, orders in report_on(name).bonds()}
    for bond, orders in report.bonds():
        assert orders.mayer == pytest.approx(regular[bond.metal, bond.donor], abs=0.03)


@pytest.mark.parametrize("amplitude_A", [1e-4, 1e-3, 1e-2])
@pytest.mark.parametrize("name", HEXAAQUA)
def test_split_degenerate_levels_settle_with_whole_or_with_smeared_electrons(name, amplitude_A):
    # A partly filled level that is degenerate but for an irregularity may cross its neighbour at every iteration.
    report = bond_report(shaken(name, amplitude_A))
    assert report.method.charge_residual < CHARGE_TOLERANCE
    said = any("smeared" in warning for warning in report.warnings)
    assert said is (report.method.smearing_eV > 0)
    assert not said or name in DEGENERATE
    regular = [orders.mayer for orders in report_on(name).orders]
    assert np.mean([orders.mayer for orders in report.orders]) == pytest.approx(np.mean(regular), abs=0.03)


@pytest.mark.parametrize("name", [*OXO_SPECIES, *TETRAOXO_D0])
def test_every_oxo_ligand_is_found_and_multiply_bonded(name):
    found = orders_by_kind(name, DonorKind.OXO)
    assert report_on(name).populations.charges[0] > 0
    expected = 4 if "O4" in name else 2 if "O2" in name else 1
    assert len(found) == expected
    for orders in found:
        assert orders.mayer > 1.3
        assert channels(orders, "sigma")[0].weight >= 0.55
        assert [channel.weight > 0.25 for channel in channels(orders, "pi")[:2]] == [True, True]


# Aqua vanadyl (Ballhausen & Gray 1962 for the order of the d levels; memory).


@pytest.fixture(scope="module")
def levels() -> dict[str, list[int]]:
    """Orbital indices of the levels of C4v, by the rule of the test below."""
    report = report_on(VANADYL)
    everything = range(len(report.basis))
    gross = local_gross_populations(
        everything, report.state.coefficients, report.overlap, report.basis, report.coordination
    )
    labels = [report.basis.function_label(i) for i in everything]
    on = {(atom, label): gross[i] for i, label in enumerate(labels) if (atom := int(report.basis.atom_of[i])) in (0, 1)}
    oxo = next(orders for bond, orders in report.bonds() if bond.kind == DonorKind.OXO)
    occupied = report.state.occupations[0] > 0
    bonding = np.where(occupied, oxo.orbital_overlap, -np.inf)

    def strongest(metal_label: str, oxygen_label: str, of: np.ndarray) -> int:
        carries = on[0, metal_label] + on[1, oxygen_label] > 0.5
        return int(np.where(carries, of, -np.inf).argmax())

    found = {
        "a1": [int(np.where(on[1, "2s"] + on[1, "2pz"] > 0.5, bonding, -np.inf).argmax())],
        "e": [strongest("3dxz", "2px", bonding), strongest("3dyz", "2py", bonding)],
    }
    taken = found["a1"] + found["e"]
    for name, functions in (("b2", ["3dxy"]), ("e*", ["3dxz", "3dyz"]), ("b1*", ["3dx2-y2"]), ("a1*", ["3dz2"])):
        found[name] = [
            int(max((k for k in everything if k not in taken), key=lambda k: on[0, label][k])) for label in functions
        ]
    return found


def test_aqua_vanadyl_levels_rise_a1_e_b2_estar_b1star_a1star(levels):
    # For sigma and pi about V=O the occupied orbital of largest V-oxo overlap population, for the rest the d-rich
    # ones; e and e* are the mean of their two components, which the waters (C2v) split a little.
    energies = report_on(VANADYL).state.energies_eV
    means = [energies[levels[name]].mean() for name in ("a1", "e", "b2", "e*", "b1*", "a1*")]
    assert (np.diff(means) > 0.3).all()
    assert len({k for members in levels.values() for k in members}) == 8
    for name in ("e", "e*"):
        assert np.ptp(energies[levels[name]]) < 0.2


def test_aqua_vanadyl_bonding_levels_bond_and_antibonding_levels_do_not(levels):
    report = report_on(VANADYL)
    overlap = report.orbital_overlap()
    shares = report.populations.orbital_shares
    for name in ("a1", "e"):
        assert (overlap[levels[name]] > 0.2).all()
    for name in ("e*", "b1*", "a1*"):
        assert (overlap[levels[name]] < -0.2).all()
        assert (shares[levels[name], 0] > 0.6).all()
    assert shares[levels["b2"][0], 0] > 0.8


def test_aqua_vanadyl_has_a_nonbonding_oxo_a1_just_above_e(levels):
    # An a1 of O 2pz that holds most of the oxygen and a third of the overlap of the bonding a1, filled, below b2.
    report = report_on(VANADYL)
    energies = report.state.energies_eV
    between = [k for k in range(len(energies)) if max(levels["e"]) < k < levels["b2"][0]]
    assert len(between) == 1
    assert report.state.occupations[:, between[0]].sum() == 2
    assert report.populations.orbital_shares[between[0], 1] > 0.8
    assert 0 < report.orbital_overlap()[between[0]] < 0.5 * report.orbital_overlap()[levels["a1"][0]]
    assert energies[between[0]] - energies[levels["e"]].mean() < 1.0


def test_aqua_vanadyl_has_one_unpaired_electron_in_dxy(levels):
    report = report_on(VANADYL)
    single = np.flatnonzero(report.state.occupations[0] != report.state.occupations[1])
    assert single.tolist() == levels["b2"] == [report.state.homo]
    gross = local_gross_populations(
        single.tolist(), report.state.coefficients, report.overlap, report.basis, report.coordination
    )[:, 0]
    most = int(gross.argmax())
    assert (report.basis.atom_of[most], report.basis.function_label(most)) == (0, "3dxy")
    assert gross[most] > 0.8
    assert report.populations.spin[0] > 0.8


def test_aqua_vanadyl_has_a_triple_bond_to_oxo_and_single_bonds_to_water():
    (oxo,) = orders_by_kind(VANADYL, DonorKind.OXO)
    strong = [channel.type for channel in oxo.channels if channel.weight >= FULL]
    assert sorted(strong) == ["pi", "pi", "sigma"]
    assert all(channel.weight < 0.3 for channel in oxo.channels[3:])
    waters = orders_by_kind(VANADYL, DonorKind.AQUA)
    assert len(waters) == 5
    for orders in waters:
        assert orders.channels[0].type == "sigma"
        assert orders.channels[0].weight > 0.35
        assert all(channel.weight < 0.15 for channel in orders.channels[1:])


# Ranking.


@pytest.mark.parametrize("name", [VANADYL, "[CrO(OH2)5]2+", "[FeO(OH2)5]2+", "[UO2(OH2)5]2+", "[PuO2(OH2)5]2+"])
def test_oxo_ranks_far_above_every_aqua_ligand(name):
    oxo, aqua = orders_by_kind(name, DonorKind.OXO), orders_by_kind(name, DonorKind.AQUA)
    assert len(aqua) == 5
    for value in ("mayer", "wiberg", "overlap_population"):
        strongest_aqua = max(getattr(orders, value) for orders in aqua)
        assert min(getattr(orders, value) for orders in oxo) > 2 * strongest_aqua


@pytest.fixture(scope="module")
def glaze() -> BondReport:
    """The oxo, alkoxo and aqua ligands of one vanadium: the invented complex of the demo."""
    from importlib import resources

    from ehmo import read

    with resources.as_file(resources.files("ehmo.cli").joinpath("data", "demo.xyz")) as path:
        return bond_report(read(path))


@pytest.mark.parametrize("value", ["mayer", "wiberg", "overlap_population"])
def test_oxo_above_alkoxo_above_aqua_on_one_metal(glaze, value):
    by_kind = {kind: [] for kind in (DonorKind.OXO, DonorKind.ALKOXO, DonorKind.AQUA)}
    for bond, orders in glaze.bonds():
        by_kind.setdefault(bond.kind, []).append(getattr(orders, value))
    assert min(by_kind[DonorKind.OXO]) > 1.5 * max(by_kind[DonorKind.ALKOXO])
    assert min(by_kind[DonorKind.ALKOXO]) > 1.5 * max(by_kind[DonorKind.AQUA])


@pytest.mark.parametrize("value", ["mayer", "wiberg", "overlap_population"])
def test_oxo_above_alkoxo_above_aqua_over_vanadium_complexes_of_published_lengths(value):
    oxo = [getattr(orders, value) for orders in orders_by_kind("VO(OCH3)3", DonorKind.OXO)]
    alkoxo = [getattr(orders, value) for orders in orders_by_kind("VO(OCH3)3", DonorKind.ALKOXO)]
    aqua = [
        getattr(orders, value)
        for name in (VANADYL, "[V(OH2)6]3+", "[V(OH2)6]2+")
        for orders in orders_by_kind(name, DonorKind.AQUA)
    ]
    assert len(alkoxo) == 3
    assert min(oxo) > 1.5 * max(alkoxo)
    assert min(alkoxo) > 1.5 * max(aqua)


# Multiple bonds other than to oxo.


@pytest.mark.parametrize(("name", "kind"), OTHER_MULTIPLE.items())
def test_donor_kind_is_found(name, kind):
    assert orders_by_kind(name, kind)


@pytest.mark.parametrize("name", [n for n, k in OTHER_MULTIPLE.items() if k in {DonorKind.NITRIDO, DonorKind.CARBYNE}])
def test_nitrido_and_carbyne_are_triply_bonded(name):
    (orders,) = orders_by_kind(name, OTHER_MULTIPLE[name])
    strong = sorted(channel.type for channel in orders.channels if channel.weight >= FULL)
    assert strong == ["pi", "pi", "sigma"]
    assert orders.mayer > 2.3


@pytest.mark.parametrize("name", [n for n, k in OTHER_MULTIPLE.items() if "imido" in k])
def test_imido_has_one_sigma_and_two_pi_channels(name):
    (orders,) = orders_by_kind(name, OTHER_MULTIPLE[name])
    assert [channel.type for channel in orders.channels[:3]].count("pi") == 2
    assert min(channel.weight for channel in orders.channels[:3]) >= 0.5
    assert orders.mayer > 1.9


def test_alkylidene_is_doubly_bonded_and_a_fischer_carbene_less_so():
    (alkylidene,) = orders_by_kind("Ta(CH2)Cl3", DonorKind.CARBENE)
    assert sorted(channel.type for channel in alkylidene.channels if channel.weight >= FULL) == ["pi", "sigma"]
    (fischer,) = orders_by_kind("Cr(CO)5(C(OMe)Me)", DonorKind.CARBENE)
    assert fischer.channels[0].type == "sigma"
    assert 0.1 < channels(fischer, "pi")[0].weight < 0.5 < channels(alkylidene, "pi")[0].weight


@pytest.mark.parametrize("name", [n for n, k in OTHER_MULTIPLE.items() if k == DonorKind.AMIDO])
def test_planar_amido_has_one_pi_channel_beside_sigma(name):
    # The nitrogen lone pair of a planar amido ligand is one pi donor function, not two.
    for orders in orders_by_kind(name, DonorKind.AMIDO):
        first, second = channels(orders, "pi")[:2]
        assert channels(orders, "sigma")[0].weight > first.weight > 0.3
        assert second.weight < 0.3 * first.weight


# Controls: one sigma channel dominates; pi interaction is shown beside it but stays smaller.


@pytest.mark.parametrize(("name", "kind"), CONTROLS.items())
def test_controls_have_one_dominant_sigma_channel(name, kind):
    found = orders_by_kind(name, kind)
    assert found
    for orders in found:
        sigma, pi = channels(orders, "sigma"), channels(orders, "pi")
        assert orders.channels[0].type == "sigma"
        assert sigma[0].weight > 0.3
        assert all(channel.weight < 0.3 * sigma[0].weight for channel in sigma[1:])
        assert all(channel.weight < FULL and channel.weight < 0.65 * sigma[0].weight for channel in pi)


@pytest.mark.parametrize("name", [*HEXAAQUA, VANADYL, "[Co(NH3)6]3+"])
def test_sigma_only_controls_have_no_pi_channel_worth_the_name(name):
    for orders in orders_by_kind(name, CONTROLS[name]):
        assert orders.mayer < 0.75
        assert sum(channel.weight for channel in channels(orders, "pi")) < 0.3


@pytest.mark.parametrize("name", HEXAAQUA)
def test_six_equal_waters_have_six_equal_bonds(name):
    mayer = [orders.mayer for orders in orders_by_kind(name, DonorKind.AQUA)]
    assert len(mayer) == 6
    assert np.ptp(mayer) < 1e-6
