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
    metal_amplitudes, donor_amplitudes : (n_mo,) ndarray
        Amplitude of each orbital on the metal and on the donor hybrid (Löwdin functions); the squares are its parts
        on them.
    """

    metal_orbital: FloatArray
    donor_orbital: FloatArray
    shares: FloatArray
    metal_amplitudes: FloatArray
    donor_amplitudes: FloatArray

    def __post_init__(self) -> None:
        put = object.__setattr__
        for name in ("metal_orbital", "donor_orbital", "shares", "metal_amplitudes", "donor_amplitudes"):
            put(self, name, frozen_floats(getattr(self, name), (len(self.metal_orbital),), name))

    def carriers(self, least_share: float) -> tuple[int, ...]:
        """Orbitals whose share is at least so large in size, largest first."""
        order = np.argsort(-self.shares, kind="stable")
        return tuple(int(k) for k in order if abs(self.shares[k]) >= least_share)

    @property
    def couplings(self) -> FloatArray:
        """(n_mo,) Product of the two amplitudes: positive in phase, negative in antibonding orbitals."""
        products: FloatArray = self.metal_amplitudes * self.donor_amplitudes
        return products

    @property
    def antibonding(self) -> int:
        """Orbital in which the two hybrids meet most strongly out of phase."""
        return int(self.couplings.argmin())
