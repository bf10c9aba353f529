"""The bonds of a page: channel bars, and the levels that carry the chosen channel."""

from __future__ import annotations

import math
from collections.abc import Mapping, Sequence

from ehmo.conventions import atom_label
from ehmo.records.coordination import MetalDonorBond
from ehmo.records.electronic import NO_ELECTRON
from ehmo.records.interaction import OrbitalSet
from ehmo.records.report import BondReport
from ehmo.records.wording import FULL_CHANNEL, LISTED_CHANNEL, PARTIAL_CHANNEL, with_deviation
from ehmo.report.page.formulas import irrep_markup, part_letter
from ehmo.report.page.markup import Markup, element, markup
from ehmo.report.page.shown import Carrier, ShownChannel
from ehmo.report.page.view import PICTURE_PX
from ehmo.report.text import hybrid_cells

_MINUS = "\N{MINUS SIGN}"


def bond_entries(report: BondReport, channels: Sequence[ShownChannel], pictures: Mapping[str, str]) -> Markup:
    """One group of channels for each distinct bond.

    Parameters
    ----------
    report : BondReport
    channels : sequence of ShownChannel
    pictures : mapping of str to str
        Addresses of the still pictures by key.

    Returns
    -------
    html : Markup
    """
    first = first_channel(report, channels)
    groups = []
    for bond in report.distinct_bonds():
        own = [shown for shown in channels if shown.bond == bond]
        rows = [_channel_row(report, shown, pictures, chosen=shown is first) for shown in own]
        weaker = _weaker(report, bond, len(own))
        if weaker:
            rows.append(element("p", weaker, class_="weaker"))
        groups.append(
            element("fieldset", element("legend", _bond_heading(report, bond)), rows, class_="bond", data_bond=bond)
        )
    return markup(groups)


def first_channel(report: BondReport, channels: Sequence[ShownChannel]) -> ShownChannel | None:
    """Channel chosen when the page opens: the heaviest pi channel of the first metal's shortest multiple bond."""
    if not channels:
        return None
    bonds = report.coordination.bonds
    return min(
        channels,
        key=lambda shown: (
            not bonds[shown.bond].may_be_multiple,
            # Of several metals the first, and rounded, so that of equal bonds and channels the first is taken.
            bonds[shown.bond].metal,
            round(bonds[shown.bond].length_A, 3),
            shown.bond,
            shown.channel.type != "pi",
            -round(shown.channel.weight, 3),
            shown.place,
        ),
    )


def _weaker(report: BondReport, bond: int, pictured: int) -> str:
    """Channels of a bond that have no picture, such as ``weaker: π 0.06``."""
    rest = report.orders[bond].channels[pictured:]
    named = [
        f"{part_letter(channel.type)} {channel.weight:.2f}" for channel in rest if channel.weight >= LISTED_CHANNEL
    ]
    return f"{'weaker' if pictured else 'channels'}: {', '.join(named)}" if named else ""


def channel_name(report: BondReport, shown: ShownChannel) -> str:
    """Such as ``pi channel of V1-O2``."""
    return f"{shown.channel.type} channel of {report.bond_label(report.coordination.bonds[shown.bond])}"


def _bond_heading(report: BondReport, place: int) -> Markup:
    bond, orders, formal = report.coordination.bonds[place], report.orders[place], report.formal_orders[place]
    spread = None if report.spread is None else report.spread.bonds[place]
    mayer = with_deviation(f"{orders.mayer:.2f}", None if spread is None else spread.mayer, 2)
    facts = [f"{bond.kind}, {bond.length_A:.3f} Å", f"Mayer {mayer}"]
    if formal is not None:
        facts.append(f"{formal.words} by counting")
    crystal = report.fragment.crystal
    if crystal is not None and (count := crystal.bonds_per_metal(bond.metal, bond.donor)) > 1:
        facts.append(f"{count} alike at the metal")
    return markup(
        [
            element("span", _bond_sign(report, bond), class_="name"),
            " ",
            element("span", "; ".join(facts), class_="facts"),
        ]
    )


def _bond_sign(report: BondReport, bond: MetalDonorBond) -> str:
    symbols = report.fragment.symbols
    return f"{atom_label(symbols[bond.metal], bond.metal)}\N{EN DASH}{atom_label(symbols[bond.donor], bond.donor)}"


def _channel_row(report: BondReport, shown: ShownChannel, pictures: Mapping[str, str], *, chosen: bool) -> Markup:
    channel, identity = shown.channel, shown.key
    deviation = None
    if report.spread is not None:
        weights = report.spread.bonds[shown.bond].channel_weights
        deviation = weights[shown.place] if shown.place < len(weights) else None
    bond = report.coordination.bonds[shown.bond]
    metal, donor = hybrid_cells(report, bond, channel)
    what = f"metal {metal}; donor {donor}"
    radio = element(
        "input",
        type="radio",
        name="channel",
        id=identity,
        value=identity,
        checked=chosen or None,
        class_="channel-radio",
    )
    label = element(
        "label",
        element("span", f"{part_letter(channel.type)} ", element("span", channel.type, class_="word"), class_="part"),
        _bar(channel.type, channel.weight, deviation),
        element("span", with_deviation(f"{channel.weight:.2f}", deviation, 2), class_="weight"),
        element("span", _class_of(channel.weight), class_="class"),
        for_=identity,
    )
    name = channel_name(report, shown)
    still = element(
        "img",
        src=pictures[identity],
        alt=f"Metal and donor hybrid of the {name}: {what}",
        width=PICTURE_PX,
        height=PICTURE_PX,
    )
    made = element("p", f"Metal hybrid {metal}; donor hybrid {donor}", class_="made")
    carriers = element("div", made, _carriers(report, shown), class_="carriers", id=f"carriers-{identity}")
    detail = element("div", element("div", still, class_="still"), carriers, class_="detail")
    return element(
        "div", radio, label, detail, class_="channel", data_name=name, data_key=identity, data_part=channel.type
    )


def _class_of(weight: float) -> str:
    return "full" if weight >= FULL_CHANNEL else "partial" if weight >= PARTIAL_CHANNEL else "weak"


def _bar(symmetry: str, weight: float, deviation: float | None) -> Markup:
    """Bar of a weight on a scale from 0 to 1, with a whisker of one standard deviation each way."""
    width, height, middle = 200.0, 14.0, 7.0
    end = width * min(weight, 1.0)
    parts = [
        element("rect", x="0", y="2", width=f"{width:g}", height=f"{height - 4:g}", class_="bar-room"),
        element("rect", x="0", y="2", width=f"{end:.1f}", height=f"{height - 4:g}", class_=f"bar-{symmetry}"),
    ]
    if deviation is not None and math.isfinite(deviation):
        low, high = (min(max(width * (weight + sign * deviation), 0), width) for sign in (-1, 1))
        parts.append(
            element("path", d=f"M{low:.1f} {middle}H{high:.1f}M{low:.1f} 3V11M{high:.1f} 3V11", class_="whisker")
        )
    return element(
        "svg", parts, view_box=f"0 0 {width:g} {height:g}", class_="bar", aria_hidden="true", preserveAspectRatio="none"
    )


def _carriers(report: BondReport, shown: ShownChannel) -> Markup:
    heading = element("p", f"Levels that carry the {channel_name(report, shown)}", class_="carriers-head")
    rows = [_carrier(carrier) for carrier in shown.carriers]
    if abs(shown.rest) >= 0.005:
        share = f"{100 * shown.rest:.0f} %".replace("-", _MINUS)
        rows.append(
            element("li", element("span", "others", class_="level-name"), element("span", share, class_="share"))
        )
    return markup([heading, element("ul", rows, class_="levels")])


def _carrier(carrier: Carrier) -> Markup:
    level = carrier.level
    share = "out of phase" if carrier.opposed else f"{100 * carrier.share:.0f} %".replace("-", _MINUS)
    buttons = [
        element(
            "button",
            f"orbital {k + 1}",
            type="button",
            class_="orbital",
            data_orbital=k,
            aria_pressed="false",
            aria_label=f"Show orbital {k + 1}: {level_in_words(level)}",
        )
        for k in level.orbitals
    ]
    facts = f"{level.energy_eV:.2f} eV, {electrons_in_level(level)}".replace("-", _MINUS)
    return element(
        "li",
        element("span", irrep_markup(level.label), " ", part_letter(level.part), class_="level-name"),
        element("span", share, class_="share"),
        element("span", facts, class_="facts"),
        element("span", buttons, class_="buttons"),
        class_="opposed" if carrier.opposed else None,
    )


def electrons_in_level(level: OrbitalSet) -> str:
    """Such as ``4 electrons`` or ``empty``."""
    count = level.alpha + level.beta
    if count <= NO_ELECTRON:
        return "empty"
    return "1 electron" if abs(count - 1) < NO_ELECTRON else f"{round(count, 2):g} electrons"


def level_in_words(level: OrbitalSet) -> str:
    """Level for those who hear the page, such as ``e, pi antibonding, -17.60 eV, empty``."""
    part = level.part
    bonding = f"{part.rstrip('*')} {'antibonding' if part.endswith('*') else 'bonding'}, " if part else ""
    name = f"{level.label}, " if level.irrep else ""
    return f"{name}{bonding}{level.energy_eV:.2f} eV, {electrons_in_level(level)}".replace("-", _MINUS)
