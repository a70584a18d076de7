"""The formula grammar: what it reads, against exact evaluation, and what it refuses, column by column."""

from __future__ import annotations

import math
import random
from fractions import Fraction

import mpmath
import numpy as np
import pytest
import sympy
from hypothesis import assume, given, settings
from hypothesis import strategies as st

from engine.errors import DesignError
from engine.model.evaluate import response
from engine.model.expression import from_expression
from engine.model.factored import Factored
from engine.model.limits import Limits
from tests.model.refusal import refused

ROOT_899 = math.sqrt(899)


@pytest.mark.parametrize(
    ("text", "gain", "zeros", "poles", "dead_time_s"),
    [
        # By hand.
        (
            "3.2*(s+40)/(s*(s^2+2*s+900)) * exp(-0.002*s)",
            3.2, [-40], [0, complex(-1, ROOT_899), complex(-1, -ROOT_899)], 0.002,
        ),
        (
            "3.2·(s + 40) / (s·(s² + 2s + 900)) · e^(−0.002 s)",
            3.2, [-40], [0, complex(-1, ROOT_899), complex(-1, -ROOT_899)], 0.002,
        ),
        ("7", 7, [], [], 0),
        ("-7", -7, [], [], 0),
        ("s", 1, [0], [], 0),
        ("1/s", 1, [], [0], 0),
        (" \t1 /\n s ", 1, [], [0], 0),
        ("1/(s+1)^12", 1, [], [-1] * 12, 0),
        ("(s+1)^12", 1, [-1] * 12, [], 0),
        ("(s+1)^5*(s+1)^7 + 0", 1, [-1] * 12, [], 0),
        ("1/(s+1)**2", 1, [], [-1, -1], 0),
        ("s^-2", 1, [], [0, 0], 0),
        ("s^+2", 1, [0, 0], [], 0),
        ("(2*s+1)^-1", 0.5, [], [-0.5], 0),
        ("-s^2", -1, [0, 0], [], 0),
        ("(-s)^2", 1, [0, 0], [], 0),
        ("2^3^2*s", 512, [0], [], 0),
        ("s^2^3", 1, [0] * 8, [], 0),
        ("--s", 1, [0], [], 0),
        ("1/-s", -1, [], [0], 0),
        ("8/4/2/s", 1, [], [0], 0),
        ("8-4-2", 2, [], [], 0),
        ("1e3*s + 2.5e-1", 1000, [-0.00025], [], 0),
        (".5*s+1.", 0.5, [-2], [], 0),
        ("0.1*s+0.2+0.1*s", 0.2, [-1], [], 0),
        # A person's common denominator: shared factors once.
        ("1/s + 1/s^2", 1, [-1], [0, 0], 0),
        ("2 + 3/s + 4*s/(0.1*s+1)", 42, [complex(-23, 4511**0.5) / 84, complex(-23, -(4511**0.5)) / 84],
         [0, -10], 0),
        ("1/(s+1) - 1/(s+2)", 1, [], [-1, -2], 0),
        # Common factors of the person's own making are kept.
        ("(s-1)/(s-1)", 1, [1], [1], 0),
        ("(s-1)/(s^2-1)", 1, [1], [-1, 1], 0),
        ("(s+1)/(s+1)/(s+1)", 1, [-1], [-1, -1], 0),
        ("s/s", 1, [0], [0], 0),
        # A feedback path closed by hand.
        ("(1/(s+2))/(1+3/(s+2))", 1, [-2], [-2, -5], 0),
        # Products without a sign.
        ("3s(s+2)", 3, [0, -2], [], 0),
        ("(s+1)(s+2)s", 1, [-1, -2, 0], [], 0),
        ("2(s+1)^2s", 2, [-1, -1, 0], [], 0),
        ("1/((s+1)(s+2))", 1, [], [-1, -2], 0),
        ("2e-3s", 0.002, [0], [], 0),
        ("2s²+2s", 2, [0, -1], [], 0),
        ("5s¹²", 5, [0] * 12, [], 0),
        # Dead time.
        ("exp(-s*0.002)", 1, [], [], 0.002),
        ("exp(-0.25s)/s", 1, [], [0], 0.25),
        ("exp(-s/4)", 1, [], [], 0.25),
        ("exp(-(1+2)*s)", 1, [], [], 3),
        ("exp(-s-s)", 1, [], [], 2),
        ("exp(0)", 1, [], [], 0),
        ("2exp(-s)*exp(-0.5*s)", 2, [], [], 1.5),
        ("exp(-s)^2", 1, [], [], 2),
        ("exp(-3*s)/exp(-s)", 1, [], [], 2),
        ("e^(-0.1*s)*2e-1", 0.2, [], [], 0.1),
        ("exp(-s)/(s+1) + 3*exp(-s)", 3, [-4 / 3], [-1], 1),
        ("exp(-s)*(1/s + 1)", 1, [-1], [0], 1),
        ("0*exp(-s) + s", 1, [0], [], 0),
    ],
)  # fmt: skip
def test_reads(text: str, gain: float, zeros: list[complex], poles: list[complex], dead_time_s: float) -> None:
    model = from_expression(text)
    np.testing.assert_allclose(model.gain, gain, rtol=2.3e-16)
    np.testing.assert_allclose(sorted(model.zeros, key=_order), sorted(map(complex, zeros), key=_order), rtol=4e-16)
    np.testing.assert_allclose(sorted(model.poles, key=_order), sorted(map(complex, poles), key=_order), rtol=4e-16)
    assert model.dead_time_s == dead_time_s


def _order(root: complex) -> tuple[float, float]:
    return root.real, root.imag


@pytest.mark.parametrize(
    ("text", "words"),
    [
        ("", ["is empty"]),
        ("  ", ["is empty"]),
        ("0", ["comes to 0"]),
        ("s-s", ["comes to 0"]),
        ("1/0", ["column 2", "division by 0"]),
        ("1/(s-s)", ["column 2", "division by 0"]),
        ("0^-1", ["column 1", "division by 0"]),
        ("0^0", ["0^0"]),
        ("(s+1", ["column 1", "never closed"]),
        ("2*(s+(1+s)", ["column 3", "never closed"]),
        ("s+1)", ["column 4", "no '('"]),
        ("exp(-s", ["column 4", "never closed"]),
        ("s+", ["column 3", "ends where"]),
        ("*s", ["column 1", "not '*'"]),
        ("s+*2", ["column 3", "not '*'"]),
        ("()", ["column 2", "not ')'"]),
        ("s^", ["column 3", "ends"]),
        ("kp*s", ["column 1", "unknown name 'kp'", "use numbers, s"]),
        ("3*S", ["column 3", "small s"]),
        ("s+2j", ["column 4", "unknown name 'j'"]),
        ("2*pi*s", ["3.14159"]),
        ("sin(s)", ["column 1", "unknown name 'sin'"]),
        ("ss", ["unknown name 'ss'"]),
        ("s2", ["unknown name 's2'"]),
        ("2 3", ["column 3", "operator is missing"]),
        ("s 3", ["column 3", "operator is missing"]),
        ("1/2s", ["column 4", "two ways"]),
        ("1/s(s+1)", ["column 4", "two ways"]),
        ("3,2*s", ["column 2", "point, as 3.2"]),
        ("[s+1]", ["column 1", "group with ( and )"]),
        ("s=1", ["column 2", "'='"]),
        ("1 % s", ["column 3", "'%'"]),
        ("\u0663s", ["column 1"]),
        ("s\x00", ["column 2"]),
        ("__import__('os')", ["column 12"]),
        ("__import__", ["unknown name '__import__'"]),
        ("().__class__", ["column 3"]),
        ("lambda: 0", ["column 7"]),
        ("s^0.5", ["column 2", "whole number"]),
        ("s^s", ["column 2", "whole number"]),
        ("s^(1/3)", ["column 2", "whole number"]),
        ("s^1e9", ["column 2", "beyond 60"]),
        ("s^-1e9", ["column 2", "beyond 60"]),
        ("s^61", ["beyond 60"]),
        ("s^40*s^40", ["column 5", "order is above 60"]),
        ("(s^30+1)^3", ["column 9", "order is above 60"]),
        ("10^1e9", ["beyond 1000"]),
        ("((10^900)^900)^900", ["beyond the range"]),
        ("s^2^2^2^2^2", ["beyond"]),
        ("1e400*s", ["column 1", "beyond the range of numbers"]),
        ("s+1e999999999", ["column 3", "beyond the range of numbers"]),
        ("1e-999999999", ["beyond the range of numbers"]),
        ("1" * 500, ["column 1", "too long"]),
        ("1e300*1e300", ["gain"]),
        ("1e-300*1e-300", ["gain"]),
        ("s+1e200", ["root", "units"]),
        ("exp(-0.1*s)/s + 1/s", ["column 15", "dead time must multiply the whole model"]),
        ("1 + exp(-s)", ["column 3", "dead time must multiply the whole model"]),
        ("1 - exp(-s)*exp(-s)", ["column 3", "dead time"]),
        ("exp(0.1*s)", ["ahead in time", "minus sign"]),
        ("1/exp(-s)", ["ahead in time"]),
        ("exp(-1e308*s)", ["at most"]),
        ("exp(-s^2)", ["column 1", "a number times s"]),
        ("exp(2)", ["column 1", "a number times s"]),
        ("exp(-s+1)", ["column 1", "a number times s"]),
        ("exp(-1/s)", ["column 1", "a number times s"]),
        ("exp(exp(-s))", ["column 1", "a number times s"]),
        ("exp s", ["column 1", "parentheses"]),
        ("e*s", ["column 1", "followed by ^"]),
        ("e^-s", ["column 1", "parentheses"]),
        ("(" * 100_000 + "s" + ")" * 100_000, ["200001 characters", "at most 4000"]),
        ("(" * 1_900 + "s" + ")" * 1_900, ["column 51", "deeper than 50"]),
        ("s^" * 1_900 + "1", ["deeper than 50"]),
        ("exp(" * 900 + "s", ["deeper than 50"]),
        ("s" * 1_000_000, ["1000000 characters"]),
        ("s*" * 1_999 + "s", ["order is above 60"]),
    ],
)
def test_refuses(text: str, words: list[str]) -> None:
    refused(lambda: from_expression(text), "text", *words)


def test_not_a_text() -> None:
    refused(lambda: from_expression(3), "text", "must be a text")
    refused(lambda: from_expression(None), "text", "must be a text")


def test_limits_are_settings() -> None:
    refused(lambda: from_expression("((s))", Limits(depth=1)), "text", "deeper than 1")
    refused(lambda: from_expression("s+11", Limits(text_length=3)), "text", "at most 3")
    refused(lambda: from_expression("s^3", Limits(order=2)), "text", "beyond 2")
    assert from_expression("((s))", Limits(depth=2)).zeros.tolist() == [0]


def test_long_signs_and_sums_are_read() -> None:
    # By hand: an even number of minus signs; a sum of 1000 terms.
    assert from_expression("-" * 3_000 + "s").gain == 1
    assert from_expression("+".join(["s"] * 1_000)).gain == 1_000


def test_work_is_bounded() -> None:
    # Sums of denominators with 200 digits each, over and over: refused, not worked out.
    text = "1/" + "+1/".join(f"(s+0.{'123456789' * 20}{k})^9" for k in range(15))
    refused(lambda: from_expression(text), "text", "column")


def test_roots_that_would_take_too_long_are_said() -> None:
    # Sixty poles 1e-45 apart: the zeros between them cannot be told apart at the precision that is spent.
    text = "+".join(f"1/(s+0.{'123456789' * 5}{k})" for k in range(10, 70))
    refused(lambda: from_expression(text), "text", "too close together", "zeros and poles")


def _random_formula(rng: random.Random, depth: int) -> tuple[str, str]:
    """The same rational function as text in our grammar and in Python's."""
    kind = rng.choice(["number", "s", "s"] if depth == 0 else ["+", "-", "*", "/", "^", "()", "neg", "number"])
    if kind == "s":
        return "s", "s"
    if kind == "number":
        number = rng.choice(["2", "0.5", "1e1", "3.25", "7", ".125", "2E-1"])
        return number, f"Rational('{number}')"
    left, left_python = _random_formula(rng, depth - 1)
    if kind == "()":
        return f"({left})", f"({left_python})"
    if kind == "neg":
        return f"-({left})", f"(-({left_python}))"
    if kind == "^":
        exponent = rng.choice([2, 3, -1])
        sign = rng.choice(["^", "**"])
        return f"({left}){sign}{exponent}", f"({left_python})**({exponent})"
    right, right_python = _random_formula(rng, depth - 1)
    space = rng.choice(["", " "])
    # Without parentheses of our own around the operands both grammars must agree on precedence.
    if kind in "+-":
        return f"{left}{space}{kind}{space}({right})", f"({left_python} {kind} ({right_python}))"
    ours = rng.choice(["*", "·", "×"]) if kind == "*" else "/"
    return f"({left}){space}{ours}{space}({right})", f"(({left_python}) {kind} ({right_python}))"


@pytest.mark.parametrize("seed", range(120))
def test_against_sympy(seed: int) -> None:
    # Second method: sympy evaluates the same formula exactly, at points clear of the axis of real roots.
    ours, theirs = _random_formula(random.Random(seed), 4)
    try:
        at_a_point = eval(theirs, {"s": Fraction(97, 89), "Rational": Fraction})
    except ZeroDivisionError:
        # A part that is 0 for every s is divided by; sympy would carry on with its own infinity.
        refused(lambda: from_expression(ours), "text", "division by 0")
        return
    if at_a_point == 0:
        refused(lambda: from_expression(ours), "text", "comes to 0")
        return
    s = sympy.Symbol("s")
    exact = sympy.sympify(theirs, locals={"s": s, "Rational": sympy.Rational})
    together = sympy.cancel(sympy.together(exact))
    model = from_expression(ours)
    for point in (Fraction(7, 3), Fraction(-11, 7)):
        at = sympy.Rational(1, 3) + sympy.I * sympy.Rational(point.numerator, point.denominator)
        want = complex(together.subs(s, at).evalf(40))
        np.testing.assert_allclose(response(model, complex(at)), want, rtol=1e-10)


@settings(deadline=None)
@given(
    st.lists(st.decimals(-1000, 1000, places=3).filter(bool), min_size=1, max_size=6),
    st.lists(st.decimals(-1000, 1000, places=3).filter(bool), min_size=1, max_size=6),
)
def test_products_come_back_factor_by_factor(zeros: list[object], poles: list[object]) -> None:
    text = "*".join(f"(s-({z}))" for z in zeros) + "/(" + "*".join(f"(s-({p}))" for p in poles) + ")"
    model = from_expression(text)
    assert sorted(model.zeros.real.tolist()) == sorted(map(float, zeros))  # type: ignore[arg-type]
    assert sorted(model.poles.real.tolist()) == sorted(map(float, poles))  # type: ignore[arg-type]


def _read_or_refused(text: str) -> Factored | None:
    try:
        return from_expression(text)
    except DesignError as error:
        (fault,) = error.faults
    assert fault.where == "text"
    assert "\n" not in fault.what
    return None


@settings(deadline=None, max_examples=400)
@given(st.text(st.sampled_from("s123.0e+-*/^()² ·exp,j"), max_size=40))
def test_any_formula_like_text_is_read_or_refused(text: str) -> None:
    model = _read_or_refused(text)
    if model is not None:
        assert math.isfinite(model.gain)
        assert model.gain != 0
        assert np.isfinite(np.concatenate([model.zeros, model.poles])).all()


@settings(deadline=None)
@given(st.text(max_size=60))
def test_any_text_is_read_or_refused(text: str) -> None:
    assume(text.strip())
    _read_or_refused(text)


def test_a_sum_is_expanded_exactly() -> None:
    # Exact: (s + 1)^12 − (s − 1)^12 = 24 s Π (s² + tan²(kπ/12)), k = 1…5 … with s = i·cot(kπ/12).
    model = from_expression("(s+1)^12 - (s-1)^12")
    with mpmath.workdps(30):
        cotangents = [float(mpmath.cot(k * mpmath.pi / 12)) for k in range(1, 12)]
    np.testing.assert_allclose(np.sort(model.zeros.imag), np.sort(cotangents), rtol=2.3e-16, atol=1e-30)
    assert not model.zeros.real.any()
    assert model.gain == 24
