"""Collects timings under a group and a role, and prints each ratio beside its limit when the run ends."""

from __future__ import annotations

from collections.abc import Callable
from dataclasses import dataclass

import pytest


@dataclass(frozen=True)
class Ratio:
    """A measured ratio, its limit if it has one, and whether it should stay below or above."""

    subject: str
    value: float
    limit: float | None
    more_is_better: bool = False

    @property
    def holds(self) -> bool:
        """Whether the ratio is on the right side of its limit."""
        if self.limit is None:
            return True
        return self.value >= self.limit if self.more_is_better else self.value <= self.limit

    def __str__(self) -> str:
        if self.limit is None:
            return f"{self.subject}: {self.value:.3g}"
        sense = "at least" if self.more_is_better else "at most"
        return f"{self.subject}: {self.value:.3g} ({sense} {self.limit:g}{'' if self.holds else ': MISSED'})"


_RATIOS = pytest.StashKey[list[Ratio]]()


def pytest_configure(config: pytest.Config) -> None:
    config.stash[_RATIOS] = []


@pytest.fixture
def record_ratio(request: pytest.FixtureRequest) -> Callable[..., None]:
    """Function that keeps a ratio for the closing list."""
    ratios = request.config.stash[_RATIOS]

    def record(subject: str, value: float, limit: float | None = None, *, more_is_better: bool = False) -> None:
        ratios.append(Ratio(subject, value, limit, more_is_better))

    return record


def pytest_terminal_summary(terminalreporter: pytest.TerminalReporter, config: pytest.Config) -> None:
    ratios = config.stash[_RATIOS]
    if ratios:
        terminalreporter.section("ratios")
        for ratio in ratios:
            terminalreporter.write_line(str(ratio))
