"""Fixtures that every test may use."""

from __future__ import annotations

import pytest

import basis_params


@pytest.fixture(scope="session")
def standard() -> basis_params.ParameterTable:
    """The shipped parameter set."""
    return basis_params.load_set("standard")
