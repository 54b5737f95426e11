"""Derives the indistinguishability of photons that leave through a detuned resonator.

    python tests/derivations/indistinguishability.py | ruff format -

prints explorer/physics/coherence_terms.py; test_derivation.py beside this file compares the two.
Needs python-flint (exact polynomials in several variables); takes about a fifth of a second.

The model: one excitation shared by an emitter (lowering operator s) and a mode (a), coupling g,
detuning d, energy decay gamma of the emitter and kappa of the mode, and pure dephasing gamma*, so
that <s> decays with Gamma/2, Gamma = gamma + gamma*. With P = <s's>, N = <a'a>, S = <a's>
(a' the adjoint of a) the master equation closes on four real numbers:

    P. = -gamma P + 2g Im(-S)      N. = -kappa N + 2g Im(S)
    S. = -[(kappa + Gamma)/2 + id] S + ig (P - N)

1. By the quantum regression theorem the pair (<a'(t) s(t+T)>, <a'(t) a(t+T)>) moves in T as the
   pair of amplitudes (<s>, <a>) does, from (S(t), N(t)). The integral of |<a'(t) a(t+T)>|^2 over T
   is therefore a quadratic form of (S(t), N(t)). Products of amplitudes move like the four numbers
   above with gamma replaced by Gamma, so the form's coefficients solve one adjoint linear system
   of four equations.
2. The integral over t of every product of two of the four numbers solves the Lyapunov equation
   L X + X L^T = -r r^T, r the excited emitter: ten equations.
3. The denominator is half the square of the integral of N over t.

All systems are solved without fractions (Bareiss), every division being exact; the greatest common
divisor is then cancelled and the rest factored. Rates are in units of kappa; G = 4 (g/kappa)^2,
a = gamma/kappa, b = gamma*/kappa, d = 2 (detuning/kappa), and only d^2 occurs. Off-diagonal numbers
are stored times 2g, so that only G occurs.
"""

from __future__ import annotations

import sys
from itertools import combinations_with_replacement
from typing import TypeAlias

from flint import Ordering, fmpz, fmpz_mpoly, fmpz_mpoly_ctx

Row = list[fmpz_mpoly]
Table: TypeAlias = "int | tuple[Table, ...]"

RING = fmpz_mpoly_ctx.get(["G", "a", "b", "d"], Ordering.lex)
COUPLING, DECAY, DEPHASING, DETUNING = RING.gens()
ONE, ZERO = RING.constant(1), RING.constant(0)
HEADING = '''"""Coefficients of the indistinguishability of photons that leave a detuned resonator.

Made by tests/derivations/indistinguishability.py, which explains the model; do not edit.

Rates are in units of kappa: G = 4 (g/kappa)^2, a = gamma/kappa, b = dephasing/kappa,
x = 4 (detuning/kappa)^2, and

    I = CAVITY_SHARE * OVERLAP / (COHERENCE_DECAY * SPECTRUM * TWO_TIMES).

Each polynomial is table[power of x][power of G][power of b][power of a]; trailing zeros are left
out and no coefficient is negative, so that nothing cancels. CAVITY_SHARE is also the denominator
of the share that leaves through the mode, G (1 + a + b)/CAVITY_SHARE.
"""

Table = tuple[tuple[tuple[tuple[int, ...], ...], ...], ...]
'''
NAMES = {
    (12, True): "CAVITY_SHARE",
    (106, True): "OVERLAP",
    (3, False): "COHERENCE_DECAY",
    (17, False): "SPECTRUM",
    (73, False): "TWO_TIMES",
}


def motion(decay: fmpz_mpoly, coherence: fmpz_mpoly) -> list[Row]:
    """Twice the generator of (P, N, 2g Re S, 2g Im S), in units of kappa."""
    mixed = -(ONE + coherence)
    return [
        [-2 * decay, ZERO, ZERO, -2 * ONE],
        [ZERO, -2 * ONE, ZERO, 2 * ONE],
        [ZERO, ZERO, mixed, DETUNING],
        [COUPLING, -COUPLING, -DETUNING, mixed],
    ]


def solution(matrix: list[Row], right: Row) -> tuple[Row, fmpz_mpoly]:
    """Numerators and the common denominator of matrix^-1 right, by fraction-free elimination."""
    rows = [[*row, value] for row, value in zip(matrix, right, strict=True)]
    size, previous = len(rows), ONE
    for step in range(size):
        candidates = [i for i in range(step, size) if rows[i][step]]
        best = min(candidates, key=lambda i: len(rows[i][step]))
        rows[step], rows[best] = rows[best], rows[step]
        pivot = rows[step]
        for row in rows:
            if row is not pivot:
                factor = row[step]
                row[:] = [
                    exact_quotient(pivot[step] * old - factor * top, previous)
                    for old, top in zip(row, pivot, strict=True)
                ]
        previous = pivot[step]
    return [row[size] for row in rows], previous


def exact_quotient(dividend: fmpz_mpoly, divisor: fmpz_mpoly) -> fmpz_mpoly:
    quotient, remainder = divmod(dividend, divisor)
    if remainder:
        raise ArithmeticError("a division that must be exact left a remainder")
    return quotient


def integrals_of_products(
    generator: list[Row],
) -> tuple[dict[tuple[int, int], fmpz_mpoly], fmpz_mpoly]:
    """X in L X + X L^T = -r r^T, r = (1, 0, 0, 0), as numerators by index pair and denominator."""
    pairs = list(combinations_with_replacement(range(4), 2))
    place = {pair: k for k, pair in enumerate(pairs)}
    matrix = [[ZERO] * len(pairs) for _ in pairs]
    for row, (i, j) in zip(matrix, pairs, strict=True):
        for k in range(4):
            row[place[min(k, j), max(k, j)]] += generator[i][k]
            row[place[min(i, k), max(i, k)]] += generator[j][k]
    # the generator is doubled, so its source is too
    numerators, denominator = solution(matrix, [-2 * ONE] + [ZERO] * (len(pairs) - 1))
    return dict(zip(pairs, numerators, strict=True)), denominator


def indistinguishability() -> tuple[fmpz_mpoly, fmpz_mpoly]:
    """Numerator and denominator, without a common factor."""
    populations = motion(DECAY, DECAY + DEPHASING)
    amplitudes = motion(DECAY + DEPHASING, DECAY + DEPHASING)
    products, products_over = integrals_of_products(populations)
    adjoint = [[amplitudes[j][i] for j in range(4)] for i in range(4)]
    form, form_over = solution(adjoint, [ZERO, -2 * ONE, ZERO, ZERO])
    times, times_over = solution(populations, [-2 * ONE, ZERO, ZERO, ZERO])
    # form . (|S|^2, N^2, N 2g Re S, N 2g Im S), and |S|^2 = [(2g Re S)^2 + (2g Im S)^2]/G
    coherent = form[0] * (products[2, 2] + products[3, 3]) + COUPLING * (
        form[1] * products[1, 1] + form[2] * products[1, 2] + form[3] * products[1, 3]
    )
    top = 2 * coherent * times_over**2
    bottom = COUPLING * form_over * products_over * times[1] ** 2
    common = top.gcd(bottom)
    return exact_quotient(top, common), exact_quotient(bottom, common)


def factors() -> dict[str, fmpz_mpoly]:
    """The five irreducible factors by name; checked: constants 1, powers 1, all terms positive."""
    found = {}
    for is_numerator, whole in zip((True, False), indistinguishability(), strict=True):
        constant, parts = whole.factor()
        if constant != 1:
            raise ArithmeticError("an unexpected constant factor")
        for part, power in parts:
            if power != 1 or any(coefficient <= 0 for coefficient in part.coeffs()):
                raise ArithmeticError("a repeated factor or a negative term")
            found[NAMES[len(part), is_numerator]] = part
    return found


def is_printed_form_on_resonance() -> bool:
    """Whether zero detuning gives, identically, the closed form printed in the documentation."""
    big, a, b = COUPLING, DECAY, DEPHASING
    top = (big * a + big + a**2 + a * b + a) * (
        4 * big * (a + 1)
        + big * b
        + 3 * a**3
        + 7 * a**2 * b
        + 13 * a**2
        + 5 * a * b**2
        + 19 * a * b
        + 13 * a
        + b**3
        + 6 * b**2
        + 10 * b
        + 3
    )
    bottom = (
        (big + a + b)
        * (a + b + 1)
        * (
            4 * big * (a + 1)
            + 2 * big * b
            + 3 * a**3
            + 4 * a**2 * b
            + 13 * a**2
            + a * b**2
            + 8 * a * b
            + 13 * a
            + b**2
            + 4 * b
            + 3
        )
    )
    derived_top, derived_bottom = indistinguishability()
    at_zero: dict[str | int, int | fmpz] = {"d": 0}
    return bool(derived_top.subs(at_zero) * bottom == derived_bottom.subs(at_zero) * top)


def is_one_without_dephasing() -> bool:
    top, bottom = (part.subs({"b": 0}) for part in indistinguishability())
    return bool(top == bottom)


def nested(terms: dict[tuple[int, ...], int], depth: int = 4) -> Table:
    """Coefficients as tuples within tuples, one level an exponent; trailing zeros left out."""
    if depth == 0:
        return terms.get((), 0)
    size = max((powers[0] + 1 for powers in terms), default=0)
    return tuple(
        nested({powers[1:]: c for powers, c in terms.items() if powers[0] == k}, depth - 1)
        for k in range(size)
    )


def tables() -> dict[str, Table]:
    """What explorer/physics/coherence_terms.py must hold: table[x][G][b][a], x = d^2."""
    found = {}
    for name, polynomial in factors().items():
        terms: dict[tuple[int, ...], int] = {}
        for (big, a, b, d), coefficient in polynomial.to_dict().items():
            if d % 2:
                raise ArithmeticError("an odd power of the detuning")
            terms[d // 2, big, b, a] = int(coefficient)
        found[name] = nested(terms)
    return found


def module_text() -> str:
    """The source of explorer/physics/coherence_terms.py, but for the line breaks."""
    bodies = [f"\n{name}: Table = {table!r}\n" for name, table in tables().items()]
    return HEADING + "".join(bodies)


def main() -> int:
    if not (is_printed_form_on_resonance() and is_one_without_dephasing()):
        print("the derived form misses a known limit", file=sys.stderr)
        return 1
    print(module_text(), end="")
    return 0


if __name__ == "__main__":
    raise SystemExit(main())
