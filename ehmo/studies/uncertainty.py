"""The uncertain parameters of a calculation, and draws of them.

A draw moves every h_ii, every exponent, K and lambda. Half of the variance of the h_ii of an element is common to its
shells, and half of that of its exponents: what is misjudged in an element is so in its shells together. All else is
independent. All exponents of the shells of one element with one l move together, so that these shells stay
orthogonal.
"""

from __future__ import annotations

from dataclasses import dataclass
from typing import Final, Literal

import numpy as np

from basis_params import ModelSettings, ParameterTable, Shell
from ehmo.errors import InputError
from ehmo.records.arrays import FloatArray
from ehmo.records.basis import Basis
from ehmo.records.spread import UncertainParameter

COMMON_VARIANCE: Final = 0.5
"""Part of the variance that the shells of an element share."""

DEFAULT_H_II_SD_EV: Final = {0: 0.5, 1: 0.5, 2: 0.8, 3: 0.8}
"""Standard deviation of h_ii by l where the table states none [eV]."""

DEFAULT_ZETA_SD: Final = 0.03
"""Relative standard deviation of the exponents where the table states none."""

DEFAULT_SD: Final = {"K": 0.05, "K_sigma": 0.05, "K_pi": 0.05, "K_delta": 0.05, "K_decay_per_A": 0.0, "lambda": 0.15}
"""Standard deviation of the constants where the table states none."""

_SMALLEST_PART = 0.1  # an h_ii keeps its sign and at least this part of itself

Kind = Literal["h_ii", "zeta", "constant"]


@dataclass(frozen=True, slots=True, eq=False)
class _Entry:
    """One parameter: what people call it, and where it acts."""

    kind: Kind
    shown: UncertainParameter
    element: str = ""
    types: tuple[int, ...] = ()


@dataclass(frozen=True, slots=True, eq=False)
class ParameterModel:
    """Uncertain parameters of a fragment; draws are rows of steps in standard deviations.

    Attributes
    ----------
    basis : Basis
        Functions of the fragment.
    entries : tuple
        The parameters, one per column of a draw.
    relative_zeta_sd : dict of str to tuple of tuple of float
        Relative standard deviation of each exponent of each shell of each element.
    settings : ModelSettings
        Constants in use.
    """

    basis: Basis
    entries: tuple[_Entry, ...]
    relative_zeta_sd: dict[str, tuple[tuple[float, ...], ...]]
    settings: ModelSettings

    @property
    def parameters(self) -> tuple[UncertainParameter, ...]:
        """What is drawn, in the order of the columns."""
        return tuple(entry.shown for entry in self.entries)

    def draws(self, count: int, seed: int) -> FloatArray:
        """Correlated normal draws.

        Parameters
        ----------
        count : int
            Number of draws.
        seed : int
            Seed of the random numbers.

        Returns
        -------
        steps : (count, n_parameters) ndarray
            Each column has variance 1.
        """
        groups = sorted({(entry.kind, entry.element) for entry in self.entries if entry.element})
        random = np.random.default_rng(seed)
        own = random.standard_normal((count, len(self.entries)))
        common = random.standard_normal((count, len(groups)))
        for column, entry in enumerate(self.entries):
            if entry.element:
                shared = common[:, groups.index((entry.kind, entry.element))]
                own[:, column] = np.sqrt(COMMON_VARIANCE) * shared + np.sqrt(1 - COMMON_VARIANCE) * own[:, column]
        return own

    def h_ii_eV(self, steps: FloatArray) -> FloatArray:
        """(n_draws, n_types) diagonal elements [eV]."""
        h = np.tile(self.basis.type_h_ii_eV, (len(steps), 1))
        for column, entry in self._of("h_ii"):
            h[:, entry.types] += entry.shown.sd * steps[:, [column]]
        tabulated = self.basis.type_h_ii_eV
        signs = np.sign(tabulated)
        kept: FloatArray = signs * np.maximum(signs * h, _SMALLEST_PART * np.abs(tabulated))
        return kept

    def exponent_steps(self, steps: FloatArray) -> FloatArray:
        """(n_draws, n_types) steps of the exponents [standard deviations]."""
        moved = np.zeros((len(steps), len(self.basis.type_h_ii_eV)))
        for column, entry in self._of("zeta"):
            moved[:, entry.types] = steps[:, [column]]
        return moved

    def constants(self, steps: FloatArray) -> dict[str, FloatArray]:
        """K of the four channels (n_draws, 4) as ``K``, ``K_decay_per_A`` and ``lambda`` (n_draws,); none below 0."""
        settings = self.settings
        given = {
            "K": settings.K,
            "K_sigma": settings.K_sigma,
            "K_pi": settings.K_pi,
            "K_delta": settings.K_delta,
            "K_decay_per_A": settings.K_decay_per_A,
            "lambda": settings.lambda_,
        }
        drawn = {name: np.full(len(steps), value) for name, value in given.items() if value is not None}
        for column, entry in self._of("constant"):
            name = entry.shown.name
            drawn[name] = np.maximum(drawn[name] + entry.shown.sd * steps[:, column], 0.0)
        channels = [drawn.get(name, drawn["K"]) for name in ("K_sigma", "K_pi", "K_delta", "K")]
        return {
            "K": np.stack(channels, axis=1),
            "K_decay_per_A": drawn["K_decay_per_A"],
            "lambda": drawn["lambda"],
        }

    def _of(self, kind: Kind) -> list[tuple[int, _Entry]]:
        return [(column, entry) for column, entry in enumerate(self.entries) if entry.kind == kind]


def parameter_model(
    basis: Basis, table: ParameterTable, settings: ModelSettings, *, self_consistent: bool
) -> ParameterModel:
    """Uncertain parameters of the elements of a fragment and of the Hamiltonian.

    Parameters
    ----------
    basis : Basis
        Functions of the fragment.
    table : ParameterTable
        Set in use, with the standard deviations that it states.
    settings : ModelSettings
        Constants in use.
    self_consistent : bool
        Whether lambda matters.

    Returns
    -------
    model : ParameterModel
        Parameters whose standard deviation is zero are left out.

    Raises
    ------
    InputError
        If the table states a standard deviation as large as the exponent.
    """
    types = _types(basis)
    entries: list[_Entry] = []
    relative: dict[str, tuple[tuple[float, ...], ...]] = {}
    for symbol in dict.fromkeys(basis.symbols):
        shells = table.element(symbol).shells
        relative[symbol] = tuple(_relative_zeta_sd(symbol, shell) for shell in shells)
        entries += [_h_ii_entry(symbol, shell, types[symbol, shell.n, shell.l]) for shell in shells]
        entries += [
            _zeta_entry(symbol, [shell for shell in shells if shell.l == l], types)
            for l in dict.fromkeys(shell.l for shell in shells)
        ]
    entries += _constants(settings, self_consistent=self_consistent)
    return ParameterModel(basis, tuple(entry for entry in entries if entry.shown.sd > 0), relative, settings)


def _types(basis: Basis) -> dict[tuple[str, int, int], int]:
    """Shell type of each element, n and l."""
    return {
        (basis.symbols[atom], int(n), int(l)): int(kind)
        for atom, n, l, kind in zip(basis.shell_atom, basis.shell_n, basis.shell_l, basis.shell_type, strict=True)
    }


def _h_ii_entry(symbol: str, shell: Shell, kind: int) -> _Entry:
    stated = shell.h_ii_sd_eV is not None
    sd = shell.h_ii_sd_eV if shell.h_ii_sd_eV is not None else DEFAULT_H_II_SD_EV[shell.l]
    shown = UncertainParameter(f"{symbol} {shell.label} h_ii", "eV", shell.h_ii_eV, sd, stated)
    return _Entry("h_ii", shown, symbol, (kind,))


def _relative_zeta_sd(symbol: str, shell: Shell) -> tuple[float, ...]:
    if shell.zeta_sd is None:
        return (DEFAULT_ZETA_SD,) * len(shell.zetas)
    if shell.zeta_sd >= min(shell.zetas):
        raise InputError(
            f"the standard deviation of the exponents of {symbol} {shell.label}, {shell.zeta_sd:g}, is as large as an "
            "exponent",
            mend="state a smaller zeta_sd in the table",
        )
    return tuple(shell.zeta_sd / zeta for zeta in shell.zetas)


def _zeta_entry(symbol: str, shells: list[Shell], types: dict[tuple[str, int, int], int]) -> _Entry:
    outer = max(shells, key=lambda shell: shell.n)
    zeta, labels = min(outer.zetas), " ".join(shell.label for shell in shells)
    sds = [DEFAULT_ZETA_SD * min(shell.zetas) if shell.zeta_sd is None else shell.zeta_sd for shell in shells]
    sd = sds[shells.index(outer)] or max(sds)
    stated = all(shell.zeta_sd is not None for shell in shells)
    shown = UncertainParameter(f"{symbol} {labels} zeta", "bohr^-1", zeta, sd, stated)
    return _Entry("zeta", shown, symbol, tuple(types[symbol, shell.n, shell.l] for shell in shells))


def _constants(settings: ModelSettings, *, self_consistent: bool) -> list[_Entry]:
    values: dict[str, float | None] = {
        "K": settings.K,
        "K_sigma": settings.K_sigma,
        "K_pi": settings.K_pi,
        "K_delta": settings.K_delta,
        "K_decay_per_A": settings.K_decay_per_A or None,
        "lambda": settings.lambda_ if self_consistent else None,
    }
    return [
        _Entry(
            "constant",
            UncertainParameter(
                name,
                "1/A" if name == "K_decay_per_A" else "",
                value,
                settings.sd.get(name, DEFAULT_SD[name]),
                name in settings.sd,
            ),
        )
        for name, value in values.items()
        if value is not None
    ]
