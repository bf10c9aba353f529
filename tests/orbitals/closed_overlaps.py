"""Closed overlap formulas of Slater-type functions, evaluated with 60 digits so that nothing cancels.

S = N_a N_b (R/2)^(n_a + n_b + 1) sum c_ij A_i(p) B_j(q), with A_i(p) = int_1^inf x^i exp(-p x) dx and
B_j(q) = int_-1^1 x^j exp(-q x) dx: Mulliken, Rieke, Orloff, Orloff, J. Chem. Phys. 17, 1248 (1949) (memory).
"""

from __future__ import annotations

from decimal import Decimal, localcontext
from math import comb, factorial

Polynomial = dict[tuple[int, int], Decimal]
"""Coefficients of mu^i nu^j."""

_SUM: Polynomial = {(1, 0): Decimal(1), (0, 1): Decimal(1)}
_DIFFERENCE: Polynomial = {(1, 0): Decimal(1), (0, 1): Decimal(-1)}
_ONE: Polynomial = {(0, 0): Decimal(1)}


def closed_overlap(a: tuple[int, int, float], b: tuple[int, int, float], m: int, distance: float) -> float:
    """Overlap of normalised functions (n, l, zeta) with parallel axes, centres at 0 and +R [bohr]."""
    with localcontext() as context:
        context.prec = 60
        zeta_a, zeta_b, r = Decimal(a[2]), Decimal(b[2]), Decimal(distance)
        polynomial = _product(_side(a[0], a[1], m, first=True), _side(b[0], b[1], m, first=False))
        polynomial = _product(polynomial, _product(_SUM, _DIFFERENCE))
        for _ in range(m):  # sin(theta_a) sin(theta_b) r_a r_b carries (mu^2 - 1)(1 - nu^2)
            polynomial = _product(polynomial, {(2, 0): Decimal(1), (0, 0): Decimal(-1)})
            polynomial = _product(polynomial, {(0, 0): Decimal(1), (0, 2): Decimal(-1)})
        p, q = (zeta_a + zeta_b) * r / 2, (zeta_a - zeta_b) * r / 2
        integral = sum(c * _a_integral(i, p) * _b_integral(j, q) for (i, j), c in polynomial.items())
        norm = (2 * zeta_a) ** (2 * a[0] + 1) * (2 * zeta_b) ** (2 * b[0] + 1)
        norm = (norm / factorial(2 * a[0]) / factorial(2 * b[0])).sqrt()
        return float(norm * (r / 2) ** (a[0] + b[0] + 1) * integral)


def _side(n: int, l: int, m: int, *, first: bool) -> Polynomial:
    """(r / (R/2))^(n - 1 - m) times the normalised Legendre function without its sines."""
    distance = _SUM if first else _DIFFERENCE
    along = {(0, 0): Decimal(1), (1, 1): Decimal(1)} if first else {(1, 1): Decimal(1), (0, 0): Decimal(-1)}
    norm = (Decimal(2 * l + 1) / 2 * factorial(l - m) / factorial(l + m)).sqrt()
    total: Polynomial = {}
    for power, coefficient in _legendre(l, m).items():
        term = _product(_power(along, power), _power(distance, n - 1 - m - power))
        for key, value in term.items():
            total[key] = total.get(key, Decimal(0)) + norm * coefficient * value
    return total


def _legendre(l: int, m: int) -> dict[int, Decimal]:
    """m-th derivative of P_l = d^l (x^2 - 1)^l / dx^l / (2^l l!), Rodrigues."""
    result: dict[int, Decimal] = {}
    for k in range(l + 1):
        degree = 2 * k - l - m
        if degree >= 0:
            derivative = factorial(2 * k) // factorial(degree)
            result[degree] = Decimal((-1) ** (l - k) * comb(l, k) * derivative) / (2**l * factorial(l))
    return result


def _product(first: Polynomial, second: Polynomial) -> Polynomial:
    result: Polynomial = {}
    for (i, j), x in first.items():
        for (k, n), y in second.items():
            result[i + k, j + n] = result.get((i + k, j + n), Decimal(0)) + x * y
    return result


def _power(polynomial: Polynomial, exponent: int) -> Polynomial:
    result = _ONE
    for _ in range(exponent):
        result = _product(result, polynomial)
    return result


def _a_integral(n: int, p: Decimal) -> Decimal:
    return (-p).exp() * sum(Decimal(factorial(n)) / factorial(k) * p ** (k - n - 1) for k in range(n + 1))


def _b_integral(n: int, q: Decimal) -> Decimal:
    if not q:
        return Decimal(2 if n % 2 == 0 else 0) / (n + 1)
    if abs(q) < Decimal("0.5"):  # series: the closed form divides by q^(n + 1)
        terms = ((-q) ** k / factorial(k) * 2 / (n + k + 1) for k in range(80) if (n + k) % 2 == 0)
        return sum(terms, start=Decimal(0))
    # The integrals from 1 and from -1 to infinity differ by the one wanted.
    return (-1) ** (n + 1) * _a_integral(n, -q) - _a_integral(n, q)
