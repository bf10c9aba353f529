"""One draw of the parameters put into a table of its own and calculated in full, without the ensemble's short cuts."""

from __future__ import annotations

from dataclasses import dataclass, replace
from math import exp

import numpy as np

import ehmo
from basis_params import ElementParameters, ModelSettings, ParameterTable, Shell
from ehmo.analysis.ladder import ladders
from ehmo.calculate import Bonding, calculate_bonding, effective_settings
from ehmo.records.report import BondReport
from ehmo.studies.uncertainty import ParameterModel, parameter_model


@dataclass(frozen=True)
class Case:
    """A report with the set and options that it was made with."""

    report: BondReport
    table: ParameterTable
    options: ehmo.Options

    @property
    def settings(self) -> ModelSettings:
        """Constants in use."""
        return effective_settings(self.table.settings, self.options)

    @property
    def model(self) -> ParameterModel:
        """Uncertain parameters."""
        return parameter_model(
            self.report.basis,
            self.table,
            self.settings,
            self_consistent=self.options.charge_model == "self-consistent",
        )

    def ladder_energies(self, bonding: Bonding) -> np.ndarray:
        """Level energies of the first metal by the selection of a whole calculation [eV]."""
        overlap = np.sum([orders.orbital_overlap for orders in bonding.orders], axis=0)
        found = ladders(
            self.report.coordination.frames,
            bonding.plan.basis,
            bonding.bonded,
            bonding.state,
            overlap,
            counted_electrons=self.report.electrons.d_electrons,
        )
        return np.array([level.energy_eV for level in found[0].levels])


def exact_draw(case: Case, steps: np.ndarray) -> Bonding:
    """Whole calculation with the parameters of one draw."""
    moved = dict(zip((p.name for p in case.model.parameters), steps, strict=True))
    sds = {p.name: p.sd for p in case.model.parameters}
    elements = {
        symbol: _drawn_element(element, case.model, moved, sds)
        for symbol, element in case.table.elements.items()
        if symbol in case.report.fragment.symbols
    }
    values = {
        name: getattr(case.settings, name) + sds[key] * moved[key]
        for name, key in (("K", "K"), ("K_sigma", "K_sigma"), ("K_pi", "K_pi"), ("lambda_", "lambda"))
        if key in moved
    }
    if "K_decay_per_A" in moved:
        values["K_decay_per_A"] = case.settings.K_decay_per_A + sds["K_decay_per_A"] * moved["K_decay_per_A"]
    settings = replace(case.settings, **values)
    table = ParameterTable("drawn", "1", settings, elements)
    return calculate_bonding(case.report.fragment, case.report.coordination, table, settings, case.options)


def _drawn_element(
    element: ElementParameters, model: ParameterModel, moved: dict[str, float], sds: dict[str, float]
) -> ElementParameters:
    shells = []
    for shell, relative in zip(element.shells, model.relative_zeta_sd[element.symbol], strict=True):
        h_ii = f"{element.symbol} {shell.label} h_ii"
        step = _zeta_step(element, shell, moved)
        zetas = tuple(zeta * exp(r * step) for zeta, r in zip(shell.zetas, relative, strict=True))
        h = shell.h_ii_eV + sds.get(h_ii, 0.0) * moved.get(h_ii, 0.0)
        shells.append(replace(shell, zetas=zetas, h_ii_eV=h))
    return replace(element, shells=tuple(shells))


def _zeta_step(element: ElementParameters, shell: Shell, moved: dict[str, float]) -> float:
    alike = " ".join(other.label for other in element.shells if other.l == shell.l)
    return moved.get(f"{element.symbol} {alike} zeta", 0.0)
