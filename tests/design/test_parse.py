"""Every mistake in a design is told by its field, what is wrong and what would be right."""

from __future__ import annotations

import copy
from typing import Any

import pytest

from engine.design.limits import Limits
from engine.design.parse import parse_design, parse_model
from engine.errors import DesignError
from tests.design.sheets import servo

ROW = {"measure": "phase_margin_deg", "at_least": 45}


def _with(path: str, value: Any) -> dict[str, Any]:
    """The servo with one place replaced: a dotted path with indices."""
    design = copy.deepcopy(servo())
    here: Any = design
    *way, last = path.split(".")
    for part in way:
        here = here[int(part)] if part.isdigit() else here[part]
    here[int(last) if last.isdigit() else last] = value
    return design


MISTAKES = [
    ("format", "something/1", "format", "must be 'loopwright-design/1'"),
    ("compensator.gain", 0, "compensator.gain", "must not be 0"),
    ("compensator.gain", float("nan"), "compensator.gain", "finite number, is nan"),
    ("compensator.gain", "7", "compensator.gain", 'must be a number, is "7"'),
    ("compensator.gain", True, "compensator.gain", "must be a number, is true"),
    ("compensator.gain", 10**400, "compensator.gain", "must be a"),
    ("compensator.stages.0.pole_rad_s", -3, "compensator.stages[0].pole_rad_s", "must be greater than 0, is -3"),
    ("compensator.stages.0.kind", "twist", "compensator.stages[0].kind", "must be one of 'lead_lag'"),
    ("compensator.stages.0.zeal", 1, "compensator.stages[0].zeal", "not a field of this format"),
    ("compensator.stages.0", {"kind": "notch"}, "compensator.stages[0].centre_rad_s", "is required"),
    ("compensator.stages.0", {"zero_rad_s": 1}, "compensator.stages[0].kind", "is required"),
    ("compensator.stages.0", 5, "compensator.stages[0]", "must be"),
    ("plant_cases", [], "plant_cases", "must not be empty"),
    ("plant_cases", {}, "plant_cases", "must be a list"),
    ("plant_cases.1.name", "empty", "plant_cases[1].name", "already the name of plant_cases[0]"),
    ("plant_cases.0.model.poles", [0, "x"], "plant_cases[0].model.poles[1]", 'must be a number, is "x"'),
    ("plant_cases.0.model.poles", [[0, 1, 2]], "plant_cases[0].model.poles[0]", "[re, im]"),
    ("plant_cases.0.model.poles", [[0, 1]], "plant_cases[0].model.poles[0]", "conjugate"),
    ("plant_cases.0.model.gain", 1e90, "plant_cases[0].model.gain", "between 1e-60 and 1e60"),
    ("compensator.gain", 1e-70, "compensator.gain", "between 1e-60 and 1e60"),
    ("plant_cases.0.model.gain", 0, "plant_cases[0].model.gain", "0"),
    ("plant_cases.0.model.poles", [-1.0] * 10_000, "plant_cases[0].model.poles", "has 10000 entries, at most 60"),
    ("plant_cases.0.model", {"kind": "measured"}, "plant_cases[0].model.kind", "not supported yet"),
    ("plant_cases.0.model", None, "plant_cases[0].model", "must be"),
    ("plant_cases.1.model.text", "__import__('os')", "plant_cases[1].model.text", "column 1"),
    ("plant_cases.1.model.text", "(" * 3000 + "s", "plant_cases[1].model.text", "deep"),
    ("plant_cases.1.model.text", "1/s" * 9000, "plant_cases[1].model.text", "at most 4000"),
    ("plant_cases.1.disturbances", [{"name": "wind"}], "plant_cases[1].disturbances", "not supported yet"),
    ("sensor", {"kind": "factored", "gain": 1}, "sensor", "not supported yet"),
    ("feedforward", {"kind": "factored", "gain": 1}, "feedforward", "not supported yet"),
    ("command_filter", {"kind": "factored", "gain": 1}, "command_filter", "not supported yet"),
    ("requirements", [{"measure": "charm", "at_least": 1}], "requirements[0].measure", "not a measure; known:"),
    ("requirements", [{"measure": "phase_margin_deg"}], "requirements[0]", "needs at_least or at_most"),
    ("requirements", [{**ROW, "at_most": 40}], "requirements[0].at_most", "must be at least 45"),
    ("requirements", [{**ROW, "at_rad_s": 3}], "requirements[0].at_rad_s", "does not go with"),
    (
        "requirements",
        [{**ROW, "cases": ["full"]}],
        "requirements[0].cases[0]",
        "not a plant case; known: empty, loaded",
    ),
    ("requirements", [{**ROW, "rank": "may"}], "requirements[0].rank", "must be 'must' or 'should'"),
    ("requirements", [{"measure": "sensitivity_db", "at_most": 6}], "requirements[0]", "needs one of at_rad_s"),
    (
        "requirements",
        [{"measure": "sensitivity_db", "at_most": 6, "over_rad_s": [5, 2]}],
        "requirements[0].over_rad_s",
        "from a lower to a higher",
    ),
    (
        "requirements",
        [{"measure": "sensitivity_db", "mask": [[1, 0], [1, 6]]}],
        "requirements[0].mask[1][0]",
        "must be above 1",
    ),
    ("requirements", [{"measure": "ramp_error", "at_most": -1}], "requirements[0].at_most", "must not be negative"),
    ("actuator", {"low": 2, "high": 1}, "actuator.high", "must be greater than low"),
    ("scenario", {"command": {"amplitude": 0}}, "scenario.command.amplitude", "must not be 0"),
    ("scenario", {"horizon_s": 0}, "scenario.horizon_s", "greater than 0"),
    ("colour", "blue", "colour", "not a field of this format"),
    ("title", 5, "title", "must be text"),
]


@pytest.mark.parametrize(("path", "value", "where", "what"), MISTAKES, ids=lambda item: str(item)[:40])
def test_a_mistake_is_told_by_its_field(path: str, value: Any, where: str, what: str) -> None:
    with pytest.raises(DesignError) as caught:
        parse_design(_with(path, value))
    faults = caught.value.faults
    assert where in [fault.where for fault in faults]
    told = next(fault.what for fault in faults if fault.where == where)
    assert what in told
    assert "\n" not in str(caught.value)
    assert len(str(caught.value)) < 1200


@pytest.mark.parametrize("document", [None, [], "design", 3, True])
def test_a_document_that_is_no_object_is_refused(document: Any) -> None:
    with pytest.raises(DesignError, match="must be a JSON object"):
        parse_design(document)


def test_several_mistakes_are_told_together() -> None:
    design = _with("compensator.gain", "x")
    design["plant_cases"][0]["name"] = ""
    with pytest.raises(DesignError) as caught:
        parse_design(design)
    assert {fault.where for fault in caught.value.faults} == {"compensator.gain", "plant_cases[0].name"}


def test_the_document_comes_back_as_it_was_written() -> None:
    written = servo()
    written["plant_cases"][0]["model"]["poles"] = [0, [-3, 4], [-3, -4]]
    assert parse_design(written).document() == written


def test_limits_are_those_handed_in() -> None:
    with pytest.raises(DesignError, match="plant_cases: has 2 entries, at most 1"):
        parse_design(servo(), Limits(plant_cases=1))


def test_a_model_alone_is_told_relative_to_itself() -> None:
    with pytest.raises(DesignError) as caught:
        parse_model({"kind": "polynomial", "numerator": [1], "denominator": ["x"]})
    assert caught.value.faults[0].where == "denominator[0]"
    found = parse_model({"kind": "state_space", "a": [[-2.0]], "b": [3], "c": [[1]], "d": 0})
    assert found.poles.tolist() == [-2.0]
    assert found.gain == 3.0


def test_an_implementation_of_a_later_kind_is_read() -> None:
    design = parse_design(servo(implementation={"kind": "digital", "sample_period_s": 0.001}))
    assert design.implementation.kind == "digital"
