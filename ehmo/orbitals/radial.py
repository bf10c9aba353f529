"""Contracted Slater-type radial functions and their one-centre integrals."""

from __future__ import annotations

from dataclasses import dataclass
from functools import lru_cache
from math import factorial, sqrt

from basis_params import Shell
from ehmo.errors import ParameterError

Primitive = tuple[int, float, float]
"""Principal quantum number n, exponent zeta [bohr^-1], weight of r^(n-1) exp(-zeta r)."""


_REPEATED_SHELL = 1e-6
"""Squared norm left after orthogonalisation below which nothing of a shell remains."""


@dataclass(frozen=True, slots=True)
class RadialFunction:
    """Normalised radial function R(r) = sum of weight r^(n-1) exp(-zeta r), with its angular momentum.

    Attributes
    ----------
    l : int
        Angular momentum quantum number.
    primitives : tuple of (int, float, float)
        n, zeta and weight of each term; the weight holds the normalisation.
    """

    l: int
    primitives: tuple[Primitive, ...]

    def overlap(self, other: RadialFunction) -> float:
        """One-centre radial integral of two functions, int R1 R2 r^2 dr."""
        return sum(
            weight1 * weight2 * factorial(n1 + n2) / (zeta1 + zeta2) ** (n1 + n2 + 1)
            for n1, zeta1, weight1 in self.primitives
            for n2, zeta2, weight2 in other.primitives
        )


def radial_function(shell: Shell) -> RadialFunction:
    """Radial function of a tabulated shell, normalised exactly.

    Printed coefficients have four digits; the small rest that the norm rule lets pass is scaled away here.
    """
    return _normalised(
        shell.l,
        tuple(
            (shell.n, zeta, coefficient * (2 * zeta) ** (shell.n + 0.5) / sqrt(factorial(2 * shell.n)))
            for zeta, coefficient in zip(shell.zetas, shell.coefficients, strict=True)
        ),
    )


@lru_cache(maxsize=256)
def orthogonal_radial_functions(shells: tuple[Shell, ...]) -> tuple[RadialFunction, ...]:
    """Radial functions of one atom, outer shells made orthogonal to inner ones of the same l.

    Slater functions such as 6p and 7p overlap on their own atom, while their tabulated energies are those of
    orthogonal atomic orbitals. Schmidt orthogonalisation, inner shell first, restores that: on-site blocks of
    S and H are diagonal.

    Parameters
    ----------
    shells : tuple of Shell
        Shells of one element.

    Returns
    -------
    functions : tuple of RadialFunction
        In the order of `shells`.

    Raises
    ------
    ParameterError
        If a shell is all but a repetition of an inner one.
    """
    functions: dict[int, RadialFunction] = {}
    for index in sorted(range(len(shells)), key=lambda i: (shells[i].l, shells[i].n)):
        function = radial_function(shells[index])
        for inner in [f for f in functions.values() if f.l == function.l]:
            projection = function.overlap(inner)
            removed = tuple((n, zeta, -projection * weight) for n, zeta, weight in inner.primitives)
            function = RadialFunction(function.l, function.primitives + removed)
        if function.overlap(function) < _REPEATED_SHELL:
            raise ParameterError(
                f"shell {shells[index].label} repeats an inner shell of the same l",
                mend="give it another n or exponent, or leave it out",
            )
        functions[index] = _normalised(function.l, function.primitives)
    return tuple(functions[index] for index in range(len(shells)))


def moment_functions(functions: tuple[RadialFunction, ...]) -> tuple[RadialFunction, ...]:
    """Radial parts of r times each function: r R with l - 1 and l + 1, for dipole integrals.

    Parameters
    ----------
    functions : tuple of RadialFunction
        Functions of one atom.

    Returns
    -------
    moments : tuple of RadialFunction
        For each function the one of lower l (none for s), then the one of higher l; not normalised.
    """
    moments = []
    for function in functions:
        raised = tuple((n + 1, zeta, weight) for n, zeta, weight in function.primitives)
        moments += [RadialFunction(l, raised) for l in (function.l - 1, function.l + 1) if l >= 0]
    return tuple(moments)


def _normalised(l: int, primitives: tuple[Primitive, ...]) -> RadialFunction:
    raw = RadialFunction(l, primitives)
    scale = 1 / sqrt(raw.overlap(raw))
    return RadialFunction(l, tuple((n, zeta, weight * scale) for n, zeta, weight in primitives))
