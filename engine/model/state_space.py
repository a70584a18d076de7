"""Models given as state-space matrices with one input and one output."""

from __future__ import annotations

from collections.abc import Sequence
from fractions import Fraction

import numpy as np

from engine.errors import DesignError
from engine.model.characteristic import characteristic_polynomial
from engine.model.exact import IntPolynomial, exact_number, split_content
from engine.model.factored import Factored
from engine.model.factored_entry import dead_time
from engine.model.limits import DEFAULT_LIMITS, Limits
from engine.model.polynomial import from_exact


def from_state_space(
    a: Sequence[object],
    b: Sequence[object],
    c: Sequence[object],
    d: object = 0.0,
    dead_time_s: object = 0.0,
    limits: Limits = DEFAULT_LIMITS,
) -> Factored:
    """c·(s·1 − a)⁻¹·b + d as gain, zeros and poles: all n poles, hidden modes as a pole and a zero alike.

    Parameters
    ----------
    a : n rows of n numbers, n >= 0
    b : n numbers, or n rows of one number
    c : n numbers, or one row of n numbers
    d : a number, [number] or [[number]]
    dead_time_s : >= 0 [s]

    The characteristic polynomials of a and of a − b·c are worked out exactly, so that a mode which the input
    does not reach or the output does not show is found as an equal pole and zero, not as two near ones.

    Raises DesignError: `a`, `a[i]`, `a[i][j]`, `b`, `b[i]`, `c`, `c[j]`, `d`, `dead_time_s`.
    """
    delay = dead_time(dead_time_s)
    rows = _square(a, limits)
    order = len(rows)
    inward = _vector(b, "b", order, column=True)
    outward = _vector(c, "c", order, column=False)
    direct = _direct(d)
    # det [s·1 − a, b; −c, d] = d·det(s·1 − a) + (det(s·1 − a + b·c) − det(s·1 − a))
    open_loop = characteristic_polynomial(rows, "a")
    closed = [[x - inward[i] * outward[j] for j, x in enumerate(row)] for i, row in enumerate(rows)]
    with_return = characteristic_polynomial(closed, "c")
    content, zeros = split_content(r + (direct - 1) * p for r, p in zip(with_return, open_loop, strict=True))
    if content == 0:
        raise DesignError("b", "has no path to the output through c and d; the model is 0")
    _, poles = split_content(open_loop)
    return _named(content * zeros[0], zeros, poles, delay)


def _named(gain: Fraction, zeros: IntPolynomial, poles: IntPolynomial, delay: float) -> Factored:
    try:
        return from_exact(gain, zeros, poles, delay)
    except DesignError as error:
        # In the fields of this model: the poles are a's, the zeros and the gain come from c, a and b together.
        where, what = error.faults[0].where, error.faults[0].what
        raise DesignError("a" if where == "denominator" else "c", what) from None


def _square(a: object, limits: Limits) -> list[list[Fraction]]:
    rows = _list(a, "a", "rows of numbers")
    if len(rows) > limits.order:
        raise DesignError("a", f"has {len(rows)} rows; at most {limits.order} are accepted")
    listed = [_list(row, f"a[{i}]", "numbers") for i, row in enumerate(rows)]
    for i, row in enumerate(listed):
        if len(row) != len(rows):
            raise DesignError(f"a[{i}]", f"must have {len(rows)} numbers, as a has {len(rows)} rows, has {len(row)}")
    return [[exact_number(x, f"a[{i}][{j}]") for j, x in enumerate(row)] for i, row in enumerate(listed)]


def _vector(given: object, where: str, order: int, *, column: bool) -> list[Fraction]:
    items = _list(given, where, "numbers")
    places = [f"{where}[{k}]" for k in range(len(items))]
    if items and all(_is_list(item) for item in items):
        nested = [_list(item, place, "numbers") for item, place in zip(items, places, strict=True)]
        if column:
            wide = next((k for k, row in enumerate(nested) if len(row) != 1), None)
            if wide is not None:
                what = f"must be one number, as the model has one input, has {len(nested[wide])}"
                raise DesignError(places[wide], what)
            items, places = [row[0] for row in nested], [f"{place}[0]" for place in places]
        elif len(nested) > 1:
            raise DesignError(where, f"must be one row, as the model has one output, has {len(nested)} rows")
        else:
            items, places = nested[0], [f"{where}[0][{k}]" for k in range(len(nested[0]))]
    if len(items) != order:
        raise DesignError(where, f"must have {order} numbers, as a has {order} rows, has {len(items)}")
    return [exact_number(item, place) for item, place in zip(items, places, strict=True)]


def _direct(d: object) -> Fraction:
    where = "d"
    for _ in range(2):
        if _is_list(d):
            items = _list(d, where, "numbers")
            if len(items) != 1:
                raise DesignError(where, f"must be one number, has {len(items)}")
            d, where = items[0], f"{where}[0]"
    return exact_number(d, where)


def _is_list(given: object) -> bool:
    return isinstance(given, list | tuple) or (isinstance(given, np.ndarray) and given.ndim > 0)


def _list(given: object, where: str, of: str) -> list[object]:
    if isinstance(given, np.ndarray):
        given = given.tolist()
    if not isinstance(given, list | tuple):
        raise DesignError(where, f"must be a list of {of}, is {str(given)[:40]!r}")
    return list(given)
