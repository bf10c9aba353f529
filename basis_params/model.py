"""Records of a parameter table: shells, elements, model settings and the table itself."""

from __future__ import annotations

import hashlib
import json
import math
from collections.abc import Iterator, Mapping
from dataclasses import asdict, dataclass, field
from typing import Any, Generic, Literal, TypeVar

Provenance = Literal["read", "memory", "derived"]
V = TypeVar("V")


class FrozenMapping(Mapping[str, V], Generic[V]):
    """Mapping that cannot be changed; unlike `types.MappingProxyType` it can be hashed and pickled."""

    __slots__ = ("_items",)

    def __init__(self, items: Mapping[str, V]) -> None:
        self._items = dict(items)

    def __getitem__(self, key: str) -> V:
        return self._items[key]

    def __iter__(self) -> Iterator[str]:
        return iter(self._items)

    def __len__(self) -> int:
        return len(self._items)

    def __hash__(self) -> int:
        return hash(frozenset(self._items.items()))

    def __repr__(self) -> str:
        return f"FrozenMapping({self._items!r})"


class MissingElementError(KeyError):
    """An element without parameters in the chosen set."""

    def __init__(self, symbol: str, set_name: str, available: tuple[str, ...]) -> None:
        super().__init__(symbol, set_name, available)
        self.symbol = symbol
        self.set_name = set_name
        self.available = available

    def __str__(self) -> str:
        return (
            f"no parameters for {self.symbol!a} in the set {self.set_name!a}: add its rows to a copy of the "
            f"table, or choose a set that has it (this one has {', '.join(self.available)})"
        )


@dataclass(frozen=True, slots=True)
class Shell:
    """One valence shell of one element.

    Attributes
    ----------
    n, l : int
        Principal and angular quantum number.
    h_ii_eV : float
        Diagonal element of the Hamiltonian, minus the valence-state ionisation energy [eV].
    zetas : tuple of float
        Slater exponents [bohr^-1].
    coefficients : tuple of float
        Coefficients of the normalised Slater functions, as printed in the source.
    source_key, locator : str
        Key in references.json (free in a user's table) and the place in that source.
    provenance : {"read", "memory", "derived"}
    h_ii_sd_eV, zeta_sd : float or None
        Standard deviations of `h_ii_eV` [eV] and of every exponent [bohr^-1]; None if unstated.
    """

    n: int
    l: int
    h_ii_eV: float
    zetas: tuple[float, ...]
    coefficients: tuple[float, ...]
    source_key: str
    locator: str
    provenance: Provenance
    h_ii_sd_eV: float | None = None
    zeta_sd: float | None = None

    @property
    def label(self) -> str:
        """Spectroscopic label such as ``3d``."""
        return f"{self.n}{'spdf'[self.l]}"


@dataclass(frozen=True, slots=True)
class ElementParameters:
    """Valence electrons and shells of one element, shells ordered by l, then n."""

    symbol: str
    valence_electrons: int
    shells: tuple[Shell, ...]

    def __post_init__(self) -> None:
        object.__setattr__(self, "shells", tuple(sorted(self.shells, key=lambda s: (s.l, s.n))))


@dataclass(frozen=True, slots=True)
class PairRepulsion:
    """Two-body energy of one pair of elements, A exp(-B R), fitted to bonds of a stated range of lengths.

    Attributes
    ----------
    first, second : str
        Elements, the one of higher atomic number first.
    amplitude_eV : float
        A; negative for a pair that the orbitals alone bind too weakly [eV].
    decay_per_A : float
        B [A^-1].
    lowest_A, highest_A : float
        Shortest and longest bond that the pair was fitted to [A].
    source_key, locator : str
        As of a shell.
    provenance : {"read", "memory", "derived"}
    """

    first: str
    second: str
    amplitude_eV: float
    decay_per_A: float
    lowest_A: float
    highest_A: float
    source_key: str
    locator: str
    provenance: Provenance

    @property
    def label(self) -> str:
        """The pair as people write it, such as ``V-O``."""
        return f"{self.first}-{self.second}"

    def energy_eV(self, distance_A: float) -> float:
        """A exp(-B R) [eV]."""
        return self.amplitude_eV * math.exp(-self.decay_per_A * distance_A)

    def covers(self, distance_A: float) -> bool:
        """Whether a bond of this length lies within the calibrated range."""
        return self.lowest_A <= distance_A <= self.highest_A


@dataclass(frozen=True, slots=True)
class ModelSettings:
    """Constants of the Hamiltonian that belong to a parameter set.

    Attributes
    ----------
    K : float
        Wolfsberg-Helmholz constant.
    weighting : bool
        Whether K is weighted by the difference of the two diagonal elements.
    K_sigma, K_pi, K_delta : float or None
        Constant of one channel; None means `K`.
    K_decay_per_A : float
        Decay of K with distance, 0 for none [A^-1].
    lambda_ : float
        Weight of the self-consistent charge potential.
    sd : mapping of str to float
        Standard deviation of a constant under its file key, e.g. ``sd["K"]``.

    References
    ----------
    wolfsberg-1952, ammeter-1978, calzaferri-1989
    """

    K: float
    weighting: bool
    K_sigma: float | None
    K_pi: float | None
    K_delta: float | None
    K_decay_per_A: float
    lambda_: float
    sd: Mapping[str, float] = field(default_factory=lambda: FrozenMapping({}))

    def __post_init__(self) -> None:
        object.__setattr__(self, "sd", FrozenMapping(self.sd))


@dataclass(frozen=True, eq=False)
class ParameterTable:
    """One parameter set: settings and elements; equal to another by content, whatever the file looks like.

    Attributes
    ----------
    name, edition : str
    settings : ModelSettings
    elements : mapping of str to ElementParameters
    inherited : tuple of str
        Header keys that the file leaves out and that were taken from the set ``standard``.
    notes : tuple of str
        Free remarks at the head of the file; no part of the content.
    origin : str
        ``built in`` or the path of the file.
    repulsion : mapping of str to PairRepulsion
        Two-body terms by their label, such as ``V-O``; empty for a set that is not calibrated for energies.
    content_sha256 : str
        Hash of name, edition, settings, all shells and pairs.
    """

    name: str
    edition: str
    settings: ModelSettings
    elements: Mapping[str, ElementParameters]
    inherited: tuple[str, ...] = ()
    notes: tuple[str, ...] = ()
    origin: str = "built in"
    repulsion: Mapping[str, PairRepulsion] = field(default_factory=lambda: FrozenMapping({}))
    content_sha256: str = field(init=False)

    def __post_init__(self) -> None:
        object.__setattr__(self, "elements", FrozenMapping(self.elements))
        object.__setattr__(self, "repulsion", FrozenMapping(self.repulsion))
        object.__setattr__(self, "content_sha256", self._digest())

    def _digest(self) -> str:
        settings = {k: getattr(self.settings, k) for k in self.settings.__slots__ if k != "sd"}
        content: dict[str, Any] = {
            "name": self.name,
            "edition": self.edition,
            "settings": settings,
            "sd": dict(self.settings.sd),
            "elements": {symbol: asdict(element) for symbol, element in self.elements.items()},
        }
        if self.repulsion:  # left out where there is none: the hash of such a table keys results of earlier editions
            content["repulsion"] = {label: asdict(pair) for label, pair in self.repulsion.items()}
        return hashlib.sha256(json.dumps(content, sort_keys=True).encode()).hexdigest()

    def __eq__(self, other: object) -> bool:
        if not isinstance(other, ParameterTable):
            return NotImplemented
        return self.content_sha256 == other.content_sha256

    def __hash__(self) -> int:
        return hash(self.content_sha256)

    def element(self, symbol: str) -> ElementParameters:
        """Return the parameters of one element.

        Raises
        ------
        MissingElementError
            If the set has no rows for `symbol`.
        """
        if symbol not in self.elements:
            raise MissingElementError(symbol, self.name, tuple(self.elements))
        return self.elements[symbol]

    def pair_repulsion(self, symbol: str, other: str) -> PairRepulsion | None:
        """Return the two-body term of two elements in either order; None where the set has none."""
        return self.repulsion.get(f"{symbol}-{other}") or self.repulsion.get(f"{other}-{symbol}")
