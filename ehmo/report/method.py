"""The method of one calculation as a paragraph for a paper, with the works it rests on."""

from __future__ import annotations

from collections.abc import Iterable
from dataclasses import dataclass

import basis_params
from basis_params import ParameterTable
from ehmo import __version__
from ehmo.errors import visible
from ehmo.records.crystal_report import CrystalReport
from ehmo.records.report import BondReport, Method


@dataclass(frozen=True, slots=True)
class MethodParagraph:
    """What was done, in sentences with numbered citations.

    Attributes
    ----------
    text : str
        Citations stand as ``[1]``, in the order in which they occur.
    citations : tuple of str
        One line each, without its number.
    keys : tuple of str
        Key of each in the bibliography of `basis_params`; free in a user's parameter table.
    """

    text: str
    citations: tuple[str, ...]
    keys: tuple[str, ...]

    def __str__(self) -> str:
        listed = [f"[{number}] {line}" for number, line in enumerate(self.citations, 1)]
        return "\n".join([self.text, "", *listed])


class _Numbers:
    """Numbers of the works cited so far."""

    def __init__(self) -> None:
        self.keys: list[str] = []

    def cite(self, *keys: str) -> str:
        """Numbers of some works in brackets; empty for none."""
        wanted = dict.fromkeys(key for key in keys if key)
        self.keys += [key for key in wanted if key not in self.keys]
        numbers = sorted(self.keys.index(key) + 1 for key in wanted)
        return f" [{', '.join(_runs(numbers))}]" if numbers else ""


def _runs(numbers: list[int]) -> Iterable[str]:
    """Numbers with three or more in a row as a range."""
    start = 0
    while start < len(numbers):
        stop = start
        while stop + 1 < len(numbers) and numbers[stop + 1] == numbers[stop] + 1:
            stop += 1
        if stop - start >= 2:
            yield f"{numbers[start]}\N{EN DASH}{numbers[stop]}"
        else:
            yield from (str(number) for number in numbers[start : stop + 1])
        start = stop + 1


def method_paragraph(report: BondReport, table: ParameterTable) -> MethodParagraph:
    """Paragraph on the method of a report.

    Parameters
    ----------
    report : BondReport
    table : ParameterTable
        Its parameter set.

    Returns
    -------
    paragraph : MethodParagraph
        Only what this calculation used is named and cited.
    """
    numbers = _Numbers()
    sentences = [
        *_hamiltonian(report.method, report.fragment.symbols, table, numbers),
        *_analysis(report, numbers),
        *_ligand_field(report, numbers),
    ]
    if report.spread is not None:
        sentences.append(
            f"Standard deviations are over {report.spread.used} draws of the parameters from their uncertainties."
        )
    return _paragraph(sentences, numbers)


def crystal_paragraph(report: CrystalReport, table: ParameterTable) -> MethodParagraph:
    """Paragraph on the method of a report on an extended structure.

    Parameters
    ----------
    report : CrystalReport
    table : ParameterTable
        Its parameter set.

    Returns
    -------
    paragraph : MethodParagraph
        Only what this calculation used is named and cited.
    """
    numbers, bonding = _Numbers(), report.bonding
    symbols = tuple(report.symbols[int(atom)] for atom in bonding.atoms)
    sentences = _hamiltonian(report.method, symbols, table, numbers)
    if report.method.charge_model != "fixed":
        sentences.append(f"Their lattice sum is Ewald's{numbers.cite('ewald-1921')}.")
    sentences.append(f"The Brillouin zone was sampled on a {bonding.state.mesh} mesh{numbers.cite('monkhorst-1976')}.")
    if bonding.path is not None:
        sentences.append(
            f"Bands were followed along {visible(bonding.path.path)}, points named as usual"
            f"{numbers.cite('setyawan-2010')}."
        )
    sentences.append(_orders(numbers))
    sentences.append(f"Overlap populations are also given against energy{numbers.cite('hughbanks-1983')}.")
    found = [(unit.metal_symbol, unit.donor_symbol, None) for unit in report.units if unit.bond_valence is not None]
    if found:
        sentences.append(_bond_valences(found, numbers))
    return _paragraph(sentences, numbers)


def _paragraph(sentences: list[str], numbers: _Numbers) -> MethodParagraph:
    known = basis_params.references()
    lines = [known[key].text if key in known else visible(key) for key in numbers.keys]
    return MethodParagraph(" ".join(sentences), tuple(lines), tuple(numbers.keys))


def _hamiltonian(method: Method, symbols: tuple[str, ...], table: ParameterTable, numbers: _Numbers) -> list[str]:
    symbols = tuple(dict.fromkeys(symbols))
    cited = numbers.cite("wolfsberg-1952", "hoffmann-1963")
    weighted = f", weighted{numbers.cite('ammeter-1978')}" if method.weighting else ""
    constants = {method.K_sigma, method.K_pi, method.K_delta}
    value = (
        f"K = {method.K:g}"
        if constants == {method.K}
        else f"K = {method.K_sigma:g} (sigma), {method.K_pi:g} (pi), {method.K_delta:g} (delta)"
    )
    sentences = [f"Extended-Hückel calculations{cited} were done with ehmo {__version__} ({value}{weighted})."]
    if method.K_decay_per_A:
        sentences.append(
            f"K falls with distance at a rate of {method.K_decay_per_A:g} Å⁻¹{numbers.cite('calzaferri-1989')}."
        )
    if method.charge_model != "fixed":
        sentences.append(
            "Orbital energies follow the atomic charges to self-consistency by softened Coulomb interactions"
            f"{numbers.cite('klopman-1964', 'ohno-1964')} with weight lambda = {method.lambda_:g}, their strength by "
            "ionisation energies and electron affinities of the atoms"
            f"{numbers.cite(*(basis_params.atom(symbol).source_key for symbol in symbols))}."
        )
    if method.smearing_eV:
        sentences.append(
            f"Levels were filled with a Fermi-Dirac width of {method.smearing_eV:g} eV{numbers.cite('mermin-1965')}."
        )
    sources = [shell.source_key for symbol in symbols for shell in table.elements[symbol].shells]
    sentences.append(
        f"Slater functions{numbers.cite('slater-1930')} and ionisation energies are those of the parameter set "
        f"{visible(method.parameter_set)}, edition {visible(method.edition)} (SHA-256 {method.parameter_sha256[:12]}), "
        f"for {', '.join(symbols)}{numbers.cite(*sources)}."
    )
    return sentences


def _analysis(report: BondReport, numbers: _Numbers) -> list[str]:
    sentences = [_orders(numbers)]
    if report.sites:
        measured = numbers.cite("zabrodsky-1992")
        shapes = (
            f" and shape measures{numbers.cite('pinsky-1998')}" if any(site.shapes for site in report.sites) else ""
        )
        sentences.append(
            f"Symmetry was judged by continuous symmetry measures{measured}{shapes} of the coordination sphere."
        )
    symbols, states = report.fragment.symbols, {site.metal: site.oxidation_state for site in report.sites}
    found = [
        (symbols[bond.metal], symbols[bond.donor], state)
        for bond in report.coordination.bonds
        for state in (None, states.get(bond.metal))
        if bond.bond_valence is not None
    ]
    if found:
        sentences.append(_bond_valences(found, numbers))
    return sentences


def _orders(numbers: _Numbers) -> str:
    return (
        f"Bonds are described by Mulliken overlap populations and charges{numbers.cite('mulliken-1955')}, Mayer bond "
        f"orders{numbers.cite('mayer-1983')}, and Wiberg orders{numbers.cite('wiberg-1968')} over "
        f"Löwdin-orthonormalised functions{numbers.cite('lowdin-1950')}, resolved into sigma, pi and delta channels by "
        "singular values of the metal-donor block of the density matrix."
    )


def _bond_valences(pairs: Iterable[tuple[str, str, int | None]], numbers: _Numbers) -> str:
    """Sentence on bond valences, with the sources of their parameters: metal, donor and oxidation state if known."""
    sources = [basis_params.bond_valence_R0(*pair).source_key for pair in dict.fromkeys(pairs)]
    return f"Bond valences follow Brown and Altermatt{numbers.cite('brown-1985', *sources)}."


def _ligand_field(report: BondReport, numbers: _Numbers) -> list[str]:
    sentences = []
    if any(site.ladder is not None for site in report.sites):
        text = (
            "Ligand-field levels are those of an effective Hamiltonian on the valence shell of the metal"
            f"{numbers.cite('des-cloizeaux-1960')}"
        )
        parameters = [site.parameters for site in report.sites if site.parameters is not None]
        if any(found.crystal_field_per_cm for found in parameters):
            text += f", read as crystal-field parameters{numbers.cite('ballhausen-1962')}"
        if any(found.angular_overlap for found in parameters):
            joint = " and" if "crystal-field" in text else ", read"
            text += f"{joint} in the angular overlap model{numbers.cite('schaffer-1965')}"
        sentences.append(f"{text}.")
    spectrum = report.spectroscopy
    if spectrum.terms is not None:
        sources = spectrum.constants.sources if spectrum.constants is not None else ()
        sentences.append(
            f"Terms come from configuration interaction within the shell{numbers.cite('racah-1942', 'tanabe-1954')} "
            f"with free-ion constants{numbers.cite(*sources)} reduced by the metal shares of the levels."
        )
    if spectrum.magnetism is not None:
        sentences.append(
            f"Magnetism is that of the terms with spin-orbit coupling{numbers.cite('griffith-1961')} and reduced "
            f"orbital momentum{numbers.cite('stevens-1953')}; moments follow Van Vleck{numbers.cite('van-vleck-1932')}."
        )
    if any(band.oscillator_strength for band in spectrum.bands):
        sentences.append(f"Oscillator strengths come from dipole integrals{numbers.cite('mulliken-1939')}.")
    return sentences
