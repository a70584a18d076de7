"""Exact characteristic polynomials: residues modulo many primes at once, put together again."""

from __future__ import annotations

import math
from collections.abc import Sequence
from fractions import Fraction
from functools import lru_cache

import numpy as np
from numpy.typing import NDArray

from engine.errors import DesignError

_MOST_BITS = 20_000
_PRIME_BITS = 30  # each prime is above 2^30 and below 2^31, so that products of residues fit 64 bits

IntArray = NDArray[np.int64]


def characteristic_polynomial(matrix: Sequence[Sequence[Fraction]], where: str) -> list[Fraction]:
    """Coefficients of det(s·1 − matrix), highest power first, exact.

    Raises DesignError at `where` for matrices so large and wide-ranging that the coefficients pass 20 000 bits.

    Source: H. Cohen, A Course in Computational Algebraic Number Theory, algorithm 2.2.9 (Hessenberg form in a
    field; from memory, pinned by the tests against another method).
    """
    order = len(matrix)
    scale = math.lcm(1, *(x.denominator for row in matrix for x in row))
    integers = [[int(x * scale) for x in row] for row in matrix]
    # A coefficient is a sum of principal minors, each at most the product of the norms of its rows (or columns).
    rows = sum((1 + sum(map(abs, row))).bit_length() for row in integers)
    columns = sum((1 + sum(map(abs, column))).bit_length() for column in zip(*integers, strict=True))
    bits = min(rows, columns) + 2
    if bits > _MOST_BITS:
        raise DesignError(where, "has too many digits over too many rows; scale the units, or give zeros and poles")
    primes = _primes(bits // _PRIME_BITS + 1)
    residues = np.array([[[x % p for x in row] for row in integers] for p in primes], dtype=np.int64)
    modulus = np.array(primes, dtype=np.int64)
    found = _polynomial(_hessenberg(residues.reshape(len(primes), order, order), modulus), modulus)
    return [c / scale**k for k, c in enumerate(_combined(found, primes))]


@lru_cache(maxsize=64)
def _primes(count: int) -> tuple[int, ...]:
    """The `count` greatest primes below 2^31."""
    found: list[int] = []
    candidate = 2**31 - 1
    while len(found) < count:
        if _is_prime(candidate):
            found.append(candidate)
        candidate -= 2
    return tuple(found)


def _is_prime(number: int) -> bool:
    """Miller-Rabin, decisive below 3 215 031 751 with the bases 2, 3, 5, 7 (OEIS A014233)."""
    if any(number % small == 0 for small in (3, 5, 7, 11, 13, 17, 19, 23)):
        return False
    odd = number - 1
    twos = (odd & -odd).bit_length() - 1
    odd >>= twos
    for base in (2, 3, 5, 7):
        x = pow(base, odd, number)
        if x in (1, number - 1):
            continue
        for _ in range(twos - 1):
            x = x * x % number
            if x == number - 1:
                break
        else:
            return False
    return True


def _hessenberg(h: IntArray, modulus: IntArray) -> IntArray:
    """Similar upper Hessenberg matrices, one a prime; h (primes, n, n) is changed in place."""
    count, order, _ = h.shape
    each = np.arange(count)
    p = modulus[:, None]
    for m in range(1, order - 1):
        # Where the whole column is 0 modulo a prime the pivot is 0 too, and so are all factors below.
        pivot = m + np.argmax(h[:, m:, m - 1] != 0, axis=1)
        h[each, m], h[each, pivot] = h[each, pivot], h[each, m].copy()
        h[each, :, m], h[each, :, pivot] = h[each, :, pivot], h[each, :, m].copy()
        factor = h[:, m + 1 :, m - 1] * _inverse(h[:, m, m - 1], modulus)[:, None] % p
        h[:, m + 1 :, :] = (h[:, m + 1 :, :] - factor[:, :, None] * h[:, m, None, :] % p[:, :, None]) % p[:, :, None]
        gained = (h[:, :, m + 1 :] * factor[:, None, :] % p[:, :, None]).sum(axis=2)
        h[:, :, m] = (h[:, :, m] + gained) % p
    return h


def _inverse(number: IntArray, modulus: IntArray) -> IntArray:
    """number^(p − 2) modulo p, which is the inverse, and 0 for 0."""
    result = np.ones_like(number)
    base = number.copy()
    exponent = modulus - 2
    for bit in range(31):
        result = np.where((exponent >> bit) & 1, result * base % modulus, result)
        base = base * base % modulus
    return result


def _polynomial(h: IntArray, modulus: IntArray) -> IntArray:
    """Characteristic polynomials of Hessenberg matrices, (primes, n + 1), highest power first."""
    count, order, _ = h.shape
    p = modulus[:, None]
    # of[k] is the polynomial of the leading k × k block, lowest power first.
    of = np.zeros((order + 1, count, order + 1), dtype=np.int64)
    of[0, :, 0] = 1
    for k in range(order):
        of[k + 1, :, 1:] = of[k, :, :-1]
        below = np.ones((count, 1), dtype=np.int64)
        for i in range(k, -1, -1):
            weight = below * h[:, i, k, None] % p
            of[k + 1] = (of[k + 1] - weight * of[i] % p) % p
            if i:
                below = below * h[:, i, i - 1, None] % p
    return of[order][:, ::-1]


def _combined(residues: IntArray, primes: tuple[int, ...]) -> list[Fraction]:
    """The integers of least magnitude with these residues (Chinese remainder theorem)."""
    whole = math.prod(primes)
    weights = [whole // p * pow(whole // p, -1, p) for p in primes]
    totals = [sum(w * r for w, r in zip(weights, column, strict=True)) % whole for column in residues.T.tolist()]
    return [Fraction(t - whole if t > whole // 2 else t) for t in totals]
