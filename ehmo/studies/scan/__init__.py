"""Scans of one bond length or angle."""

from ehmo.studies.scan.plan import angle_plan, bond_plan, displaced
from ehmo.studies.scan.run import empty_scan, run_scan

__all__ = ["angle_plan", "bond_plan", "displaced", "empty_scan", "run_scan"]
