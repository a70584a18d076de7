"""The published schemas: valid JSON Schema 2020-12, and every document the product ships or writes fits its own."""

from __future__ import annotations

from typing import Any

import httpx
import pytest
from jsonschema import Draft202012Validator

from engine.design.assess import assess
from engine.design.parse import parse_design
from engine.design.schemas import json_schemas
from engine.design.transfer_function import hand_over
from tests.server.asking import assert_refused, client
from tests.server.faulty_designs import FAULTY

SCHEMAS = json_schemas()


@pytest.fixture
def ask(workbench_url: str) -> httpx.Client:
    with client(workbench_url) as made:
        yield made


def _faults(name: str, document: Any) -> list[str]:
    return [
        error.json_path + ": " + error.message for error in Draft202012Validator(SCHEMAS[name]).iter_errors(document)
    ]


@pytest.mark.parametrize("name", SCHEMAS)
def test_each_schema_is_valid_and_served(ask: httpx.Client, name: str) -> None:
    assert SCHEMAS[name]["$schema"] == "https://json-schema.org/draft/2020-12/schema"
    Draft202012Validator.check_schema(SCHEMAS[name])
    answer = ask.get(f"/api/schemas/{name}")
    assert answer.headers["content-type"] == "application/schema+json"
    assert answer.json() == SCHEMAS[name]
    assert name in ask.get("/api/schemas").json()


def test_an_unknown_schema_is_refused(ask: httpx.Client) -> None:
    assert_refused(ask.get("/api/schemas/nothing"), 404, "name", "there are design")


def test_every_demo_fits_the_schema_of_designs(demo_design: dict[str, Any]) -> None:
    assert _faults("design", demo_design) == []
    # What is written back fits as well.
    assert _faults("design", parse_design(demo_design).document()) == []


def test_the_models_and_requirements_of_the_demos_fit_theirs(demo_design: dict[str, Any]) -> None:
    for case in demo_design["plant_cases"]:
        assert _faults("model", case["model"]) == []
    for row in demo_design["requirements"]:
        assert _faults("requirement", row) == []


def test_what_is_written_fits_its_schema(demo_design: dict[str, Any]) -> None:
    design = parse_design(demo_design)
    assert _faults("assessment", assess(design)) == []
    assert _faults("assessment", assess(design, curves=True)) == []
    handed_over = hand_over(design)
    assert _faults("transfer-function", handed_over) == []
    # And the schema would notice: a reading without its state, a root that is no pair.
    spoiled = assess(design)
    del spoiled["cases"][0]["readings"]["phase_margin_deg"]["state"]
    assert _faults("assessment", spoiled) != []
    handed_over["compensator"]["poles"] = [[1.0]]
    assert _faults("transfer-function", handed_over) != []


_STRUCTURAL = ("no object", "wrong type", "unknown field", "unknown stage", "format of tomorrow", "no plant case",
               "a complex number of three", "unknown kind", "no kind", "nothing")  # fmt: skip


@pytest.mark.parametrize("faulty", [one for one in FAULTY if one.name in _STRUCTURAL], ids=lambda one: one.name)
def test_the_schema_refuses_what_the_reader_refuses(plain_design: dict[str, Any], faulty: Any) -> None:
    assert _faults("design", plain_design) == []
    assert _faults("design", faulty.spoiled(plain_design)) != []
