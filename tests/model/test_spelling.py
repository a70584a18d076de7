"""Models spelled as formulas, and read back."""

from __future__ import annotations

import numpy as np
import pytest
from hypothesis import given, settings
from hypothesis import strategies as st

from engine.model.expression import from_expression
from engine.model.factored import Factored
from engine.model.factored_entry import factored_model
from engine.model.spelling import as_text


@pytest.mark.parametrize(
    ("model", "text"),
    [
        # By hand.
        (factored_model(3.2, [-40], [0, [-1, 899**0.5], [-1, -(899**0.5)]], 0.002),
         "3.2·(s + 40) / (s·(s² + 2s + 900)) · e^(−0.002s)"),
        (factored_model(1, [], [0]), "1 / s"),
        (factored_model(-1, [], [0]), "−1 / s"),
        (factored_model(-1, [0], []), "−s"),
        (factored_model(1, [], []), "1"),
        (factored_model(-2.5, [], []), "−2.5"),
        (factored_model(1, [], [], 1), "e^(−s)"),
        (factored_model(-1, [], [], 0.5), "−1 · e^(−0.5s)"),
        (factored_model(1, [], [-1] * 12), "1 / (s + 1)¹²"),
        (factored_model(2, [3, 0, 0], [[0, 2], [0, -2], [0, 2], [0, -2]]), "2·s²·(s − 3) / (s² + 4)²"),
        (factored_model(1, [], [[0.5, 2], [0.5, -2]]), "1 / (s² − s + 4.25)"),
        (factored_model(1e6, [], [-1e-5, -1e9]), "1000000 / ((s + 1e−5)·(s + 1e9))"),
        (factored_model(1 / 3, [], [-2 / 3]), "0.333333 / (s + 0.666667)"),
    ],
)  # fmt: skip
def test_spelled(model: Factored, text: str) -> None:
    assert as_text(model) == text


sizes = st.builds(lambda mantissa, power: mantissa * 10.0**power, st.floats(1, 9.99), st.integers(-6, 6))
signs = st.sampled_from([-1.0, 1.0])
reals = st.one_of(st.just(0.0), st.builds(lambda x, y: x * y, sizes, signs))
damped = st.builds(lambda w, zeta: [-zeta * w, w * (1 - zeta * zeta) ** 0.5], sizes, st.floats(-0.9, 0.9))


@st.composite
def models(draw: st.DrawFn) -> Factored:
    def roots() -> list[object]:
        pairs = draw(st.lists(damped, max_size=3))
        return [*draw(st.lists(reals, max_size=4)), *pairs, *([re, -im] for re, im in pairs)]

    return factored_model(draw(sizes) * draw(signs), roots(), roots(), draw(st.one_of(st.just(0.0), sizes)))


def _order(root: complex) -> tuple[float, float]:
    return abs(root), root.imag


@settings(deadline=None)
@given(models())
def test_read_back_with_all_digits(model: Factored) -> None:
    back = from_expression(as_text(model, 17))
    assert back.gain == model.gain
    assert back.dead_time_s == model.dead_time_s
    for got, want in ((back.zeros, model.zeros), (back.poles, model.poles)):
        left = list(got)
        for root in want:
            nearest = min(left, key=lambda other: abs(other - root))
            np.testing.assert_allclose(nearest, root, rtol=3e-15)
            left.remove(nearest)
        assert not left


@settings(deadline=None)
@given(models(), st.integers(3, 8))
def test_spelling_is_stable(model: Factored, digits: int) -> None:
    """What is read back is spelled the same once more, so a formula does not drift as it is copied."""
    text = as_text(model, digits)
    again = as_text(from_expression(text), digits)
    assert as_text(from_expression(again), digits) == again
    assert len(again) <= len(text) + 8
