"""Fixtures of the batch tests: the command line, and a real PostgreSQL server."""

from tests.cli.conftest import ehmo, refused  # noqa: F401
from tests.store.conftest import database, server  # noqa: F401
