"""A bond channel seen as orbitals."""

from __future__ import annotations

from dataclasses import dataclass

import numpy as np

from ehmo.records.arrays import FloatArray, frozen_floats


@dataclass(frozen=True, slots=True, eq=False)
class ChannelOrbitals:
    """The two hybrids of a channel as orbitals, and what each molecular orbital has to do with it.

    Attributes
    ----------
    metal_orbital, donor_orbital : (n_ao,) ndarray
        Hybrids over the basis functions, normalised, with the phases in which the density binds them.
    shares : (n_mo,) ndarray
        Part of the channel's weight that each orbital carries; they add up to 1, empty orbitals carry none.
    couplings : (n_mo,) ndarray
        Product of each orbital's amplitudes on the metal and on the donor hybrid (Löwdin functions): positive where
        the two are in phase, negative in the antibonding orbitals of the channel, between -1/2 and 1/2.
    """

    metal_orbital: FloatArray
    donor_orbital: FloatArray
    shares: FloatArray
    couplings: FloatArray

    def __post_init__(self) -> None:
        put = object.__setattr__
        for name in ("metal_orbital", "donor_orbital", "shares", "couplings"):
            put(self, name, frozen_floats(getattr(self, name), (len(self.metal_orbital),), name))

    def carriers(self, least_share: float) -> tuple[int, ...]:
        """Orbitals whose share is at least so large in size, largest first."""
        order = np.argsort(-self.shares, kind="stable")
        return tuple(int(k) for k in order if abs(self.shares[k]) >= least_share)

    @property
    def antibonding(self) -> int:
        """Orbital in which the two hybrids meet most strongly out of phase."""
        return int(self.couplings.argmin())
