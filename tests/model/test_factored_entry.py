"""Gain, zeros and poles as entered: pairing, ranges, refusals."""

from __future__ import annotations

import numpy as np
import pytest
from hypothesis import given
from hypothesis import strategies as st

from engine.model.factored_entry import factored_model
from engine.model.limits import Limits
from tests.model.refusal import refused


def test_pairs_in_any_order_and_any_spelling() -> None:
    model = factored_model(
        -3, [4, [0, 0], -0.0], [[-1, 2], [-5, 0], (-3 - 4j), [-1, -2], np.complex128(-3 + 4j), np.float64(7)], 0.25
    )
    assert model.zeros.tolist() == [4, 0, 0]
    assert not np.signbit(model.zeros.real).any()
    assert model.poles.tolist() == [-1 + 2j, -1 - 2j, -5, -3 - 4j, -3 + 4j, 7]
    assert (model.gain, model.dead_time_s) == (-3, 0.25)


def test_a_partner_that_lost_digits_in_print() -> None:
    # The exact conjugate takes the place of one that is off by 1e-10 of its size; 1e-6 off is another root.
    model = factored_model(1, [], [[-1.0000000001, 200], [-1, -200]])
    assert model.poles.tolist() == [-1.0000000001 + 200j, -1.0000000001 - 200j]
    refused(lambda: factored_model(1, [], [[-1, 2], [-1, -2.00001]]), "poles[0]", "no conjugate", "add [-1, -2]")


def test_repeated_pairs() -> None:
    model = factored_model(1, [], [[-1, 2], [-1, 2], [-1, -2], [-1, -2]])
    assert model.poles.tolist() == [-1 + 2j, -1 - 2j] * 2


@given(st.lists(st.complex_numbers(min_magnitude=1e-3, max_magnitude=1e6), max_size=8), st.randoms())
def test_any_order_of_conjugates_is_paired(roots: list[complex], random: object) -> None:
    given_roots = [x for r in roots for x in ([r, r.conjugate()] if r.imag else [r])]
    random.shuffle(given_roots)  # type: ignore[attr-defined]
    poles = factored_model(1, [], given_roots).poles.tolist()
    assert len(poles) == len(given_roots)
    k = 0
    while k < len(poles):
        if poles[k].imag:
            assert poles[k + 1] == poles[k].conjugate()
        k += 2 if poles[k].imag else 1
    got = sorted(poles, key=lambda r: (r.real, r.imag))
    np.testing.assert_allclose(got, sorted(given_roots, key=lambda r: (r.real, r.imag)), rtol=1e-8)


@pytest.mark.parametrize(
    ("arguments", "where", "words"),
    [
        ((0, [], []), "gain", ["must not be 0"]),
        ((float("inf"), [], []), "gain", ["finite"]),
        (("2", [], []), "gain", ["must be a number", "'2'"]),
        ((None, [], []), "gain", ["must be a number"]),
        ((1, [[1, 2]], []), "zeros[0]", ["no conjugate", "add [1, -2]"]),
        ((1, [], [-1, [3, -2]]), "poles[1]", ["no conjugate", "add [3, 2]"]),
        ((1, [], [[0, 1], [0, -1], [0, 1]]), "poles[2]", ["no conjugate"]),
        ((1, [], [[1, 2, 3]]), "poles[0]", ["[re, im]", "3 parts"]),
        ((1, [], ["a"]), "poles[0]", ["must be a number"]),
        ((1, [], [[1, None]]), "poles[0]", ["must be a number"]),
        ((1, [], [float("nan")]), "poles[0]", ["finite"]),
        ((1, [], [complex(1, float("inf"))]), "poles[0]", ["finite"]),
        ((1, [], [1e40]), "poles[0]", ["1e+30"]),
        ((1, [], [-1e-40]), "poles[0]", ["1e-30"]),
        ((1, [], [-1.0] * 10_000), "poles", ["10000", "at most 60"]),
        ((1, [], [], -0.1), "dead_time_s", ["must be 0 or greater, is -0.1"]),
        ((1, [], [], float("nan")), "dead_time_s", ["finite"]),
        ((1, [], [], 1e300), "dead_time_s", ["at most"]),
    ],
)
def test_refused(arguments: tuple[object, ...], where: str, words: list[str]) -> None:
    refused(lambda: factored_model(*arguments), where, *words)  # type: ignore[arg-type]


def test_limit_is_a_setting() -> None:
    refused(lambda: factored_model(1, [], [-1, -2, -3], 0, Limits(order=2)), "poles", "at most 2")
