"""JSON in, `Design` out, or one pointed line for each mistake."""

from __future__ import annotations

import json
import math
from collections.abc import Mapping
from typing import Any

from pydantic import TypeAdapter, ValidationError

from engine.design.document import LATER_FIELDS, LATER_MODELS, Design, Model
from engine.design.limits import Limits, too_many
from engine.design.measures import MEASURES
from engine.design.resolve import check_models, check_stages, factored_of
from engine.errors import DesignError, Fault
from engine.model.factored import Factored

_MODEL: TypeAdapter[Any] = TypeAdapter(Model)
_ECHO_CHARACTERS = 60


def parse_design(data: Any, limits: Limits | None = None) -> Design:
    """Read a design document.

    Parameters
    ----------
    data : what `json.loads` returned
    limits : how large the design may be; the defaults of `Limits` when left out

    Raises
    ------
    DesignError : with a fault for every mistake found, each naming its field
    """
    limits = limits or Limits()
    if not isinstance(data, Mapping):
        raise DesignError("", f"a design must be a JSON object, is {_kind_of(data)}")
    faults = [*_not_yet(data), *_too_large(data, limits)]
    if faults:
        raise DesignError.of(faults)
    try:
        design = Design.model_validate(data)
    except ValidationError as error:
        raise DesignError.of(_faults_of(error, data, limits.faults_listed)) from None
    faults = [*_meaning(design), *check_stages(design.compensator), *check_models(design.plant_cases)]
    if faults:
        raise DesignError.of(faults[: limits.faults_listed])
    return design


def parse_model(data: Any, limits: Limits | None = None) -> Factored:
    """Read one model by itself; faults are relative to the model."""
    limits = limits or Limits()
    if not isinstance(data, Mapping):
        raise DesignError("", f"a model must be a JSON object, is {_kind_of(data)}")
    faults = [*_later_model(data, ""), *_model_too_large(data, "", limits)]
    if faults:
        raise DesignError.of(faults)
    try:
        model = _MODEL.validate_python(data)
    except ValidationError as error:
        raise DesignError.of(_faults_of(error, data, limits.faults_listed)) from None
    return factored_of(model)


# --- what is refused before the fields are read ----------------------------------------------------------------


def _not_yet(data: Mapping[str, Any]) -> list[Fault]:
    faults = [
        Fault(field, f"is not supported yet; leave it out ({instead})")
        for field, instead in LATER_FIELDS.items()
        if data.get(field) is not None
    ]
    for index, case in enumerate(_rows(data.get("plant_cases"))):
        if not isinstance(case, Mapping):
            continue
        here = f"plant_cases[{index}]"
        if case.get("disturbances"):
            what = "is not supported yet; leave it out (a unit load at the plant input is assumed)"
            faults.append(Fault(f"{here}.disturbances", what))
        faults += _later_model(case.get("model"), f"{here}.model")
    return faults


def _later_model(model: Any, here: str) -> list[Fault]:
    if isinstance(model, Mapping) and isinstance(model.get("kind"), str) and model["kind"] in LATER_MODELS:
        where = f"{here}.kind" if here else "kind"
        return [Fault(where, f"{_echo(model['kind'])} is not supported yet; use a factored, polynomial, "
                      "state_space or expression model")]  # fmt: skip
    return []


def _too_large(data: Mapping[str, Any], limits: Limits) -> list[Fault]:
    compensator = data.get("compensator")
    stages = compensator.get("stages") if isinstance(compensator, Mapping) else None
    faults = [
        too_many(where, len(_rows(rows)), most)
        for where, rows, most in (
            ("plant_cases", data.get("plant_cases"), limits.plant_cases),
            ("compensator.stages", stages, limits.stages),
            ("requirements", data.get("requirements"), limits.requirements),
        )
        if len(_rows(rows)) > most
    ]
    if faults:
        return faults
    for index, case in enumerate(_rows(data.get("plant_cases"))):
        if isinstance(case, Mapping):
            faults += _model_too_large(case.get("model"), f"plant_cases[{index}].model", limits)
    for index, stage in enumerate(_rows(stages)):
        faults += _model_too_large(stage, f"compensator.stages[{index}]", limits)
    for index, row in enumerate(_rows(data.get("requirements"))):
        mask = row.get("mask") if isinstance(row, Mapping) else None
        if len(_rows(mask)) > limits.mask_points:
            faults.append(too_many(f"requirements[{index}].mask", len(_rows(mask)), limits.mask_points))
    for field in ("title", "notes"):
        text = data.get(field)
        if isinstance(text, str) and len(text) > limits.text_characters:
            faults.append(Fault(field, f"has {len(text)} characters, at most {limits.text_characters} are taken"))
    return faults


def _model_too_large(model: Any, here: str, limits: Limits) -> list[Fault]:
    if not isinstance(model, Mapping):
        return []
    prefix = f"{here}." if here else ""
    faults = []
    for field in ("zeros", "poles", "numerator", "denominator", "a", "b", "c", "d"):
        rows = _rows(model.get(field))
        most = limits.order + (field in ("numerator", "denominator"))
        longest = max([len(rows), *(len(_rows(row)) for row in rows)])
        if longest > most:
            faults.append(too_many(prefix + field, longest, most))
    text = model.get("text")
    if isinstance(text, str) and len(text) > limits.expression_characters:
        what = f"has {len(text)} characters, at most {limits.expression_characters} are taken"
        faults.append(Fault(f"{prefix}text", what))
    return faults


def _rows(value: Any) -> list[Any]:
    return value if isinstance(value, list) else list(value) if isinstance(value, tuple) else []


# --- what the fields mean together ------------------------------------------------------------------------------


def _meaning(design: Design) -> list[Fault]:
    faults: list[Fault] = []
    names: dict[str, int] = {}
    for index, case in enumerate(design.plant_cases):
        if case.name in names:
            what = f"{_echo(case.name)} is already the name of plant_cases[{names[case.name]}]; names must differ"
            faults.append(Fault(f"plant_cases[{index}].name", what))
        names.setdefault(case.name, index)
    limits = design.actuator
    if limits.low is not None and limits.high is not None and limits.low >= limits.high:
        faults.append(Fault("actuator.high", f"must be greater than low, {limits.low:g}, is {limits.high:g}"))
    faults += [
        Fault(f"scenario.{shape}.amplitude", "must not be 0")
        for shape in ("command", "load")
        if getattr(design.scenario, shape).amplitude == 0
    ]
    for index, row in enumerate(design.requirements):
        faults += _requirement_faults(row, f"requirements[{index}]", names)
    return faults


def _requirement_faults(row: Any, here: str, names: Mapping[str, int]) -> list[Fault]:
    measure = MEASURES.get(row.measure)
    if measure is None:
        return [Fault(f"{here}.measure", f"{_echo(row.measure)} is not a measure; known: {', '.join(MEASURES)}")]
    faults: list[Fault] = []
    places = [field for field in ("at_rad_s", "over_rad_s", "mask") if getattr(row, field) is not None]
    if measure.per_frequency and len(places) != 1:
        faults.append(Fault(here, f"{row.measure} needs one of at_rad_s, over_rad_s, mask, has {len(places)}"))
    if not measure.per_frequency and places:
        faults.append(Fault(f"{here}.{places[0]}", f"does not go with {row.measure}; leave it out"))
    bounded = row.at_least is not None or row.at_most is not None
    if row.mask is None and not bounded:
        faults.append(Fault(here, "needs at_least or at_most"))
    if row.mask is not None and bounded:
        faults.append(Fault(f"{here}.mask", "holds the limits itself; leave at_least and at_most out"))
    if row.mask is None and row.mask_side is not None:
        faults.append(Fault(f"{here}.mask_side", "goes with mask only; leave it out"))
    if row.at_least is not None and row.at_most is not None and row.at_least > row.at_most:
        faults.append(Fault(f"{here}.at_most", f"must be at least {row.at_least:g} (at_least), is {row.at_most:g}"))
    for side in ("at_least", "at_most"):
        bound = getattr(row, side)
        if measure.scale == "ratio" and bound is not None and bound < 0:
            faults.append(Fault(f"{here}.{side}", f"must not be negative for {row.measure}, is {bound:g}"))
    if row.over_rad_s is not None and row.over_rad_s[0] >= row.over_rad_s[1]:
        faults.append(Fault(f"{here}.over_rad_s", "must run from a lower to a higher frequency, is "
                            f"[{row.over_rad_s[0]:g}, {row.over_rad_s[1]:g}]"))  # fmt: skip
    for point, (low, high) in enumerate(zip(row.mask or (), (row.mask or ())[1:], strict=False), start=1):
        if high[0] <= low[0]:
            faults.append(Fault(f"{here}.mask[{point}][0]", f"must be above {low[0]:g}, is {high[0]:g}"))
    for position, name in enumerate(row.cases or ()):
        if name not in names:
            what = f"{_echo(name)} is not a plant case; known: {', '.join(names)}"
            faults.append(Fault(f"{here}.cases[{position}]", what))
    return faults


# --- pydantic's findings in our words ---------------------------------------------------------------------------


def _faults_of(error: ValidationError, data: Any, most: int) -> list[Fault]:
    faults: list[Fault] = []
    seen: set[str] = set()
    details = error.errors(include_url=False)
    for detail in details:
        if detail["loc"] and detail["loc"][-1] == "float" and isinstance(detail["input"], (list, tuple)):
            continue  # the other half of "a number or [re, im]" says it better
        where = _path(detail["loc"], data, detail["type"])
        if where not in seen and len(faults) < most:
            seen.add(where)
            faults.append(Fault(where, _words(dict(detail))))
    return faults


def _path(location: tuple[int | str, ...], data: Any, kind_of_error: str) -> str:
    """The field's path: pydantic's location without the union tags it puts in."""
    path, here = "", data
    for position, part in enumerate(location):
        if isinstance(part, int):
            path += f"[{part}]"
            here = here[part] if isinstance(here, (list, tuple)) and part < len(here) else None
            continue
        in_object = isinstance(here, Mapping)
        last = position == len(location) - 1
        if not (in_object and part in here) and not (last and in_object and kind_of_error == "missing"):
            continue
        path += f".{part}" if path else part
        here = here.get(part) if in_object else None
    if kind_of_error.startswith("union_tag"):
        path += ".kind" if path else "kind"
    return path


def _words(detail: dict[str, Any]) -> str:
    context, given = detail.get("ctx", {}), _echo(detail.get("input"))
    match detail["type"]:
        case "missing":
            return "is required"
        case "extra_forbidden":
            return "is not a field of this format; check the spelling or leave it out"
        case "union_tag_not_found":
            return "is required"
        case "union_tag_invalid":
            return f"must be one of {context['expected_tags']}, is {_echo(context['tag'])}"
        case "literal_error":
            return f"must be {context['expected']}, is {given}"
        case "finite_number":
            return f"must be a finite number, is {given}"
        case "greater_than":
            return f"must be greater than {context['gt']:g}, is {given}"
        case "greater_than_equal":
            return f"must not be less than {context['ge']:g}, is {given}"
        case "too_short" | "string_too_short":
            return "must not be empty" if context.get("min_length") == 1 else f"needs {context['min_length']} entries"
        case "too_long" | "string_too_long":
            return f"is too long, at most {context.get('max_length')} are taken"
        case "model_type" | "model_attributes_type" | "dict_type":
            return f"must be an object, is {given}"
        case "tuple_type" | "list_type":
            return f"must be a list, is {given}"
        case "value_error":
            return str(context["error"])
        case kind if kind.startswith("float"):
            return f"must be a number, is {given}"
        case kind if kind.startswith("string"):
            return f"must be text, is {given}"
        case kind if kind.startswith("bool"):
            return f"must be true or false, is {given}"
    return f"{detail['msg'][:1].lower()}{detail['msg'][1:]}, is {given}"


def _kind_of(value: Any) -> str:
    names = {list: "a list", str: "text", bool: "true or false", int: "a number", float: "a number"}
    return "null" if value is None else names.get(type(value), type(value).__name__)


def _echo(value: Any) -> str:
    if isinstance(value, float) and not math.isfinite(value):
        return str(value)
    if isinstance(value, (Mapping, list, tuple)):
        return "an object" if isinstance(value, Mapping) else f"a list of {len(value)}"
    if isinstance(value, int) and not isinstance(value, bool) and abs(value) > 10**18:
        return f"a whole number of {value.bit_length()} bits"
    text = json.dumps(value, ensure_ascii=False, default=str)
    return text if len(text) <= _ECHO_CHARACTERS else text[: _ECHO_CHARACTERS - 1] + "…"
