"""The cross-check: a bond report beside a minimal-basis run of the same fragment in PySCF."""

from __future__ import annotations

from ehmo.studies.crosscheck.compare import crosscheck
from ehmo.studies.crosscheck.reference import DEFAULT_TIMEOUT_S, default_cache, reference_run

__all__ = ["DEFAULT_TIMEOUT_S", "crosscheck", "default_cache", "reference_run"]
