"""The final transfer function, `loopwright-transfer-function/1`: what the colleague's script reads."""

from __future__ import annotations

from typing import Any

import numpy as np

from engine.design import document as doc
from engine.design.assess import assess
from engine.design.canonical import design_sha256
from engine.design.coefficients import Coefficients, expanded
from engine.design.pid_form import pid_forms
from engine.design.resolve import compensator_of, stage_of
from engine.design.stage_facts import trade_name
from engine.model.factored import ComplexArray, Factored

FORMAT = "loopwright-transfer-function/1"

CAUTIONS = (
    "A computed margin is a statement about a model. Commission at low gain with travel and current limits set, a "
    "reachable emergency stop and nobody in the machine's reach; validate on the hardware before trusting it "
    "unattended.",
    "The safety functions of a machine are designed under the standards and by the people that local rules require "
    "(machinery: ISO 12100, ISO 13849-1, IEC 60204-1; drives: IEC 61800-5-2; functional safety: IEC 61508); this "
    "tool is no part of them.",
    "Mains and high-energy converters: qualified persons only, and local codes come first.",
)
"""The usual cautions; the screen, the files and the README show the same words."""


def hand_over(design: doc.Design, link: str | None = None) -> dict[str, Any]:
    """The compensator with its evidence, ready for JSON.

    Parameters
    ----------
    design : a parsed design; an unstable one, or one that misses a requirement, is handed over and says so
    link : address of the stored design for tracing back, if there is one
    """
    assessment = assess(design)
    compensator = compensator_of(design.compensator)
    names = design.signals
    return {
        "format": FORMAT,
        "title": design.title,
        "verdict": assessment["verdict"],
        "warnings": _warnings(assessment),
        "compensator": {
            "gain": compensator.gain,
            "zeros": root_pairs(compensator.zeros),
            "poles": root_pairs(compensator.poles),
            **_coefficients_json(expanded(compensator)),
            "realisable": compensator.relative_degree >= 0,
        },
        "pid": pid_forms(compensator),
        "overall_gain": design.compensator.gain,
        "stages": [_stage(stage) for stage in design.compensator.stages],
        "units": {
            "frequency": "rad/s",
            "time": "s",
            "command": names.command.unit,
            "output": names.output.unit,
            "effort": names.effort.unit,
        },
        "implementation": {"kind": design.implementation.kind},
        "requirements": assessment["requirements"],
        "headline": assessment["headline"],
        "cases": [
            {"name": case["name"], "stable": case["stable"], "stability": case["stability"]}
            for case in assessment["cases"]
        ],
        "notices": assessment["notices"],
        "cautions": list(CAUTIONS),
        "design_sha256": design_sha256(design.document()),
        "link": link,
    }


def root_pairs(roots: ComplexArray) -> list[list[float]]:
    """Roots as `[re, im]`."""
    return [[float(root.real), float(root.imag)] for root in roots]


def _coefficients_json(coefficients: Coefficients) -> dict[str, Any]:
    return {
        "numerator": coefficients.numerator,
        "denominator": coefficients.denominator,
        "largest_relative_response_error": coefficients.largest_relative_response_error,
    }


def _warnings(assessment: dict[str, Any]) -> list[str]:
    warnings = [
        f"UNSTABLE on {case['name']}: {case['stability']}" for case in assessment["cases"] if not case["stable"]
    ]
    for row in assessment["requirements"]:
        if row["met"] is not True:
            state = "NOT MET" if row["met"] is False else "NOT ASSESSABLE"
            where = f" on {row['case']}" if row["case"] else ""
            warnings.append(f"{state}: {row['label']}{where}: {row['shortfall']}")
    return warnings


def _stage(stage: Any) -> dict[str, Any]:
    model: Factored = stage_of(stage)
    return {
        **stage.model_dump(mode="json", exclude_none=True),
        "trade_name": trade_name(stage),
        "response": {
            "gain": float(np.real(model.gain)),
            "zeros": root_pairs(model.zeros),
            "poles": root_pairs(model.poles),
        },
    }
