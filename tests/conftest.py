"""Fixtures that every test may use."""

from __future__ import annotations

from collections.abc import Iterator

import pytest

import basis_params
from ehmo.orbitals import parameters


@pytest.fixture(scope="session", autouse=True)
def uncalibrated() -> Iterator[None]:
    """Where a test names no set it means `standard`, for which its numbers were measured; see `calibrated`."""
    kept = parameters.CALIBRATED_SETS
    parameters.CALIBRATED_SETS = ()
    yield
    parameters.CALIBRATED_SETS = kept


@pytest.fixture
def calibrated(monkeypatch) -> None:
    """The choice of the set as users have it: a calibrated one where it has every element."""
    monkeypatch.setattr(parameters, "CALIBRATED_SETS", ("oxo",))


@pytest.fixture(scope="session")
def standard() -> basis_params.ParameterTable:
    """The shipped parameter set."""
    return basis_params.load_set("standard")
