"""Reports that several tests of the figures share."""

from functools import cache

from ehmo import Options, bond_report, spread_report
from tests.geometries import SPECIES

SIMPLE_TO_CROWDED = (
    "UO2 2+", "VOCl3", "MnO4 -", "[VO(OH2)5]2+", "[FeO(OH2)5]2+", "fac-[MoO3F3]3-", "[PuO2(OH2)5]2+", "[UO2(OH2)5]2+",
    "V(NC6H5)Cl3", "W(CCH3)(OCH3)3", "[Fe(OH2)6]3+", "Ti(NMe2)4",
)  # fmt: skip


@cache
def report(name, bands=(), draws=0):
    """Bond report of a species, with observed bands or a spread if asked for."""
    options = Options(observed_bands_per_cm=bands)
    fragment = SPECIES[name].fragment()
    return spread_report(fragment, options=options, draws=draws) if draws else bond_report(fragment, options=options)
