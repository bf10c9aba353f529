"""From a fragment and a parameter set to a bond report: the one place where the numeric boxes meet."""

from ehmo.calculate.numbers import Bonding, calculate_bonding, effective_settings
from ehmo.calculate.report import bond_report, known_report

__all__ = ["Bonding", "bond_report", "calculate_bonding", "effective_settings", "known_report"]
