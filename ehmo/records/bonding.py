"""Populations, bond orders and bond channels."""

from __future__ import annotations

from dataclasses import dataclass

from ehmo.conventions import BOND_SYMMETRIES
from ehmo.records.arrays import FloatArray, frozen_floats

SMALLEST_CHANNEL = 1e-3
"""Channels of less weight are not listed."""


@dataclass(frozen=True, slots=True, eq=False)
class Populations:
    """Mulliken population analysis.

    Attributes
    ----------
    gross, net : (n_ao,) ndarray
        Gross and net population of each function [e].
    charges : (n_atoms,) ndarray
        Core charge minus gross population, positive = electron poor [e].
    spin : (n_atoms,) ndarray
        Alpha minus beta gross population of each atom [e].
    shell_overlap : (n_shells, n_shells) ndarray
        Overlap population of each pair of shells, 2 sum P S over both halves; net populations on the diagonal [e].
    atom_overlap : (n_atoms, n_atoms) ndarray
        The same by atoms [e].
    orbital_shares : (n_mo, 3) ndarray
        Share of each orbital on the metals, on the donor atoms and on the rest, by gross population.
    """

    gross: FloatArray
    net: FloatArray
    charges: FloatArray
    spin: FloatArray
    shell_overlap: FloatArray
    atom_overlap: FloatArray
    orbital_shares: FloatArray

    def __post_init__(self) -> None:
        n_ao, n_atoms, n_shells = len(self.gross), len(self.charges), len(self.shell_overlap)
        shapes: dict[str, tuple[int | None, ...]] = {
            "gross": (n_ao,),
            "net": (n_ao,),
            "charges": (n_atoms,),
            "spin": (n_atoms,),
            "shell_overlap": (n_shells, n_shells),
            "atom_overlap": (n_atoms, n_atoms),
            "orbital_shares": (n_ao, 3),
        }
        for name, shape in shapes.items():
            object.__setattr__(self, name, frozen_floats(getattr(self, name), shape, name))


@dataclass(frozen=True, slots=True, eq=False)
class BondChannel:
    """One sigma, pi, delta or phi part of a bond.

    Attributes
    ----------
    type : str
        "sigma", "pi", "delta" or "phi": the largest of `shares`.
    weight : float
        Its part of the Wiberg order.
    shares : (4,) ndarray
        Parts of the metal hybrid with |m| = 0, 1, 2, 3 about the bond axis; they add up to 1.
    metal_hybrid, donor_hybrid : (n,) ndarray
        Normalised hybrids over the (Löwdin-orthonormalised) functions of the metal and of the donor.
    """

    type: str
    weight: float
    shares: FloatArray
    metal_hybrid: FloatArray
    donor_hybrid: FloatArray


@dataclass(frozen=True, slots=True, eq=False)
class BondOrders:
    """What the density matrix says about one metal-donor bond.

    Attributes
    ----------
    overlap_population : float
        Mulliken overlap population, positive = bonding [e].
    mayer, wiberg : float
        Mayer order, and Wiberg order in the Löwdin basis.
    channel_weights : (n_channels,) ndarray
        Falling; they add up to the Wiberg order.
    channel_shares : (n_channels, 4) ndarray
        Parts with |m| = 0, 1, 2, 3 about the bond axis.
    metal_hybrids, donor_hybrids : (n_channels, n) ndarray
        One normalised hybrid per row.
    orbital_overlap : (n_mo,) ndarray
        Overlap population of each orbital holding two electrons, filled or not [e].
    """

    overlap_population: float
    mayer: float
    wiberg: float
    channel_weights: FloatArray
    channel_shares: FloatArray
    metal_hybrids: FloatArray
    donor_hybrids: FloatArray
    orbital_overlap: FloatArray

    def __post_init__(self) -> None:
        count = len(self.channel_weights)
        put = object.__setattr__
        put(self, "channel_weights", frozen_floats(self.channel_weights, (count,), "channel_weights"))
        put(self, "channel_shares", frozen_floats(self.channel_shares, (count, 4), "channel_shares"))
        put(self, "metal_hybrids", frozen_floats(self.metal_hybrids, (count, None), "metal_hybrids"))
        put(self, "donor_hybrids", frozen_floats(self.donor_hybrids, (count, None), "donor_hybrids"))
        put(self, "orbital_overlap", frozen_floats(self.orbital_overlap, (None,), "orbital_overlap"))

    @property
    def channels(self) -> tuple[BondChannel, ...]:
        """The channels by falling weight, those below `SMALLEST_CHANNEL` left out."""
        listed = int((self.channel_weights >= SMALLEST_CHANNEL).sum())
        kinds = self.channel_shares.argmax(axis=1)
        return tuple(
            BondChannel(
                BOND_SYMMETRIES[kinds[k]],
                float(self.channel_weights[k]),
                self.channel_shares[k],
                self.metal_hybrids[k],
                self.donor_hybrids[k],
            )
            for k in range(listed)
        )
