"""Every route of the contract, asked over a real connection."""

from __future__ import annotations

import csv
import gzip
import io
import re
from collections.abc import Callable
from pathlib import Path
from typing import Any

import httpx
import numpy as np
import pytest

from engine.design.assess import CURVES
from engine.design.measures import MEASURES
from engine.design.purposes import PURPOSES
from tests.server.asking import JSON, assert_refused, client
from tests.workbench_process import WorkbenchProcess


@pytest.fixture
def ask(workbench_url: str) -> httpx.Client:
    with client(workbench_url) as made:
        yield made


def test_healthz(ask: httpx.Client) -> None:
    assert ask.get("/healthz").json()["ok"] is True
    assert ask.head("/healthz").status_code == 200


def test_the_workbench_names_no_other_host(ask: httpx.Client) -> None:
    page = ask.get("/")
    assert page.headers["content-type"] == "text/html; charset=utf-8"
    assert '<meta name="loopwright-token" content="">' in page.text
    assert not re.search(r"""(src|href)=["'](https?:)?//""", page.text)
    assert not re.search(r"<script(?![^>]*\bsrc=)(?![^>]*application/json)", page.text)  # the policy forbids inline
    assert ask.head("/").status_code == 200


def test_everything_the_page_names_is_there(ask: httpx.Client) -> None:
    named = re.findall(r"""(?:src|href)=["']([^"']+)["']""", ask.get("/").text)
    assert len(named) > 3
    for path in named:
        assert ask.get(path).status_code == 200, path


# --- shared designs ---------------------------------------------------------------------------------------------


def test_a_design_is_shared_opened_and_withdrawn(ask: httpx.Client, plain_design: dict[str, Any]) -> None:
    made = ask.post("/api/designs", json=plain_design)
    assert made.status_code == 201
    ticket = made.json()
    assert ticket["link"] == f"{ask.base_url}/d/{ticket['token']}".replace("//d/", "/d/")
    path = f"/api/designs/{ticket['token']}"

    opened = ask.get(path).json()
    assert opened["design"] == plain_design  # as it was written: nothing added, nothing lost
    assert opened["design_sha256"] == ticket["design_sha256"]
    assert "withdraw_key" not in opened
    page = ask.get(ticket["link"], headers={"Accept": "text/html"})
    assert page.status_code == 200
    assert f'<meta name="loopwright-token" content="{ticket["token"]}">' in page.text

    assert_refused(ask.delete(path), 401, "X-Withdraw-Key")
    assert_refused(ask.delete(path, headers={"X-Withdraw-Key": "wrong"}), 403, "X-Withdraw-Key")
    assert ask.get(path).status_code == 200
    gone = ask.delete(path, headers={"X-Withdraw-Key": ticket["withdraw_key"]})
    assert gone.json() == {"ok": True, "token": ticket["token"], "withdrawn": True}
    assert_refused(ask.get(path), 404, "token", "withdrawn")
    assert_refused(ask.delete(path, headers={"X-Withdraw-Key": ticket["withdraw_key"]}), 404)


def test_unknown_tokens(ask: httpx.Client) -> None:
    for token in ("nothing", "%00", "..%2f..%2fetc%2fpasswd", "x" * 5000, "ü"):
        assert_refused(ask.get(f"/api/designs/{token}"), 404)
        assert_refused(ask.get(f"/d/{token}"), 404)
    page = ask.get("/d/nothing", headers={"Accept": "text/html,*/*"})  # a browser gets the page, which explains
    assert page.status_code == 404
    assert 'content="nothing"' in page.text


def test_what_is_in_a_token_cannot_leave_its_attribute(ask: httpx.Client) -> None:
    page = ask.get('/d/"><script>x', headers={"Accept": "text/html"})
    assert "<script>x" not in page.text


def test_the_same_design_shared_twice_has_two_links(ask: httpx.Client, plain_design: dict[str, Any]) -> None:
    first, second = (ask.post("/api/designs", json=plain_design).json() for _ in range(2))
    assert first["token"] != second["token"]
    assert first["design_sha256"] == second["design_sha256"]
    ask.delete(f"/api/designs/{first['token']}", headers={"X-Withdraw-Key": first["withdraw_key"]})
    assert ask.get(f"/api/designs/{second['token']}").status_code == 200


def test_links_start_with_the_base_address(launch_workbench: Callable[..., WorkbenchProcess],
                                           plain_design: dict[str, Any]) -> None:  # fmt: skip
    started = launch_workbench(LOOPWRIGHT_BASE_URL="https://loops.example", LOOPWRIGHT_MAX_STORED_DESIGNS="1")
    with client(started.url) as ask:
        ticket = ask.post("/api/designs", json=plain_design).json()
        assert ticket["link"] == f"https://loops.example/d/{ticket['token']}"
        assert_refused(ask.post("/api/designs", json=plain_design), 507, "", "the link store holds 1 designs")


def test_a_link_outlives_a_killed_server(launch_workbench: Callable[..., WorkbenchProcess],
                                         plain_design: dict[str, Any]) -> None:  # fmt: skip
    started = launch_workbench()
    with client(started.url) as ask:
        ticket = ask.post("/api/designs", json=plain_design).json()
    started.kill()
    started.start_again()
    with client(started.url) as ask:
        assert ask.get(f"/api/designs/{ticket['token']}").json()["design"] == plain_design


def test_a_store_that_cannot_be_used_is_told_and_the_rest_goes_on(
    launch_workbench: Callable[..., WorkbenchProcess], plain_design: dict[str, Any], tmp_path: Path
) -> None:
    notes = tmp_path / "notes.txt"
    notes.write_text("no store " * 1000)
    with client(launch_workbench(store=notes).url) as ask:
        assert_refused(ask.post("/api/designs", json=plain_design), 503, "", "the link store is not a link store")
        assert_refused(ask.get("/healthz"), 503)
        assert str(notes) not in ask.get("/healthz").text
        assert ask.post("/api/assessment", json=plain_design).status_code == 200


# --- computing --------------------------------------------------------------------------------------------------


def test_an_assessment_with_curves_on_request(ask: httpx.Client, plain_design: dict[str, Any]) -> None:
    plain = ask.post("/api/assessment", json=plain_design).json()
    with_curves = ask.post("/api/assessment?curves=true", json=plain_design).json()
    curves = with_curves.pop("curves")
    assert with_curves == plain
    assert plain["verdict"] == "met"
    assert set(curves) == set(CURVES)
    assert len(curves["magnitude_db"]) == 2
    assert len(curves["magnitude_db"][0]) == len(curves["omega_rad_s"])
    assert_refused(ask.post("/api/assessment?curves=perhaps", json=plain_design), 422, "curves")


def test_the_transfer_function_as_a_file(ask: httpx.Client, plain_design: dict[str, Any]) -> None:
    answer = ask.post("/api/exports/transfer-function", json=plain_design)
    assert answer.headers["content-disposition"] == 'attachment; filename="bench-axis-transfer-function.json"'
    made = answer.json()
    assert made["format"] == "loopwright-transfer-function/1"
    assert made["link"] is None
    ticket = ask.post("/api/designs", json=plain_design).json()
    traced = ask.post(f"/api/exports/transfer-function?token={ticket['token']}", json=plain_design).json()
    assert traced["link"] == ticket["link"]
    assert traced["design_sha256"] == made["design_sha256"] == ticket["design_sha256"]


def test_a_token_of_another_design_is_no_trace(ask: httpx.Client, plain_design: dict[str, Any]) -> None:
    ticket = ask.post("/api/designs", json=plain_design).json()
    plain_design["compensator"]["gain"] = 2.0
    for token, what in ((ticket["token"], "stands for another design"), ("nothing", "stands for no shared design")):
        answer = ask.post(f"/api/exports/transfer-function?token={token}", json=plain_design)
        assert_refused(answer, 422, "token", what)


def test_the_curves_as_a_table(ask: httpx.Client, plain_design: dict[str, Any]) -> None:
    answer = ask.post("/api/exports/curves", json=plain_design)
    assert answer.headers["content-type"] == "text/csv; charset=utf-8"
    assert answer.headers["content-disposition"] == 'attachment; filename="bench-axis-curves.csv"'
    rows = list(csv.DictReader(io.StringIO(answer.text)))
    assert {row["case"] for row in rows} == {"empty", "loaded"}
    assert {row["axis_unit"] for row in rows} == {"rad/s", "s"}


@pytest.mark.parametrize("kind", ["c", "structured-text", "python", "netlist"])
def test_later_exports_are_refused_by_name(ask: httpx.Client, plain_design: dict[str, Any], kind: str) -> None:
    answer = ask.post(f"/api/exports/{kind}", json=plain_design)
    assert_refused(answer, 404, "kind", f"the export {kind} is not in this version yet")


def test_unknown_exports_are_refused(ask: httpx.Client, plain_design: dict[str, Any]) -> None:
    assert_refused(ask.post("/api/exports/x", json=plain_design), 404, "kind", "there are transfer-function and curves")


@pytest.mark.parametrize("path", ["/api/proposals", "/api/reports", "/api/measurements"])
def test_later_routes_are_refused_by_name(ask: httpx.Client, path: str) -> None:
    assert_refused(ask.post(path, json={}), 404, "", "not in this version yet")


def test_one_model_by_itself(ask: httpx.Client) -> None:
    text = "3*(s+40)/(s*(s^2+2*s+900))*exp(-0.002*s)"
    made = ask.post("/api/models", json={"model": {"kind": "expression", "text": text}}).json()
    # By hand: zeros of the factors; s² + 2s + 900 = 0 at −1 ± j·√899.
    assert made["ok"] is True
    assert made["gain"] == 3
    assert made["zeros"] == [[-40, 0]]
    assert made["dead_time_s"] == 0.002
    np.testing.assert_allclose(sorted(made["poles"]), [[-1, -(899**0.5)], [-1, 899**0.5], [0, 0]], rtol=1e-15)
    assert "900" in made["text"]


def test_a_wrong_model_is_pointed_at(ask: httpx.Client) -> None:
    answer = ask.post("/api/models", json={"model": {"kind": "expression", "text": "1/(s+"}})
    assert_refused(answer, 422, "text", "column 6")
    assert_refused(ask.post("/api/models", json={}), 422, "model", "is missing")
    assert_refused(ask.post("/api/models", json=[1]), 422, "", "must be a JSON object")


@pytest.mark.parametrize("purpose", PURPOSES)
def test_a_stage_for_each_purpose(ask: httpx.Client, plain_design: dict[str, Any], purpose: str) -> None:
    made = ask.post("/api/stages", json={"design": plain_design, "purpose": purpose}).json()
    assert made["ok"] is True
    assert made["why"].endswith((".", "it."))
    plain_design["compensator"]["stages"].append(made["stage"])
    assert ask.post("/api/assessment", json=plain_design).status_code == 200


def test_an_unknown_purpose_is_refused(ask: httpx.Client, plain_design: dict[str, Any]) -> None:
    for purpose in ("tune", 3, None):
        assert_refused(ask.post("/api/stages", json={"design": plain_design, "purpose": purpose}), 422, "purpose")
    assert_refused(ask.post("/api/stages", json={"purpose": "add phase"}), 422, "design", "is missing")
    more = {"design": plain_design, "purpose": "add phase", "more": 1}
    assert_refused(ask.post("/api/stages", json=more), 422, "more")


# --- lists ------------------------------------------------------------------------------------------------------


def test_the_demos(ask: httpx.Client) -> None:
    demos = ask.get("/api/demos").json()
    assert len(demos) >= 6
    assert sum(demo["landing"] for demo in demos) == 1
    for demo in demos:
        assert demo["title"]
        assert demo["summary"]
        found = ask.get(f"/api/demos/{demo['name']}").json()
        assert found["design"]["title"] == demo["title"]
        verdict = ask.post("/api/assessment", json=found["design"]).json()["verdict"]
        assert verdict == "not met" or not demo["landing"]
    assert_refused(ask.get("/api/demos/nothing"), 404, "name")
    assert_refused(ask.get("/api/demos/..%2f..%2fpyproject"), 404)


def test_the_measures(ask: httpx.Client) -> None:
    measures = ask.get("/api/measures").json()
    assert [measure["measure"] for measure in measures] == list(MEASURES)
    for measure in measures:
        assert measure["direction"] in ("at_least", "at_most")
        assert measure["kind"] in ("scalar", "frequency")
        assert measure["needs"] == (["at_rad_s", "over_rad_s", "mask"] if measure["kind"] == "frequency" else [])
        assert measure["what"].endswith(".")


# --- files, words about the API, what is not there --------------------------------------------------------------


def test_the_plotly_script_is_served_from_the_package_and_kept(ask: httpx.Client) -> None:
    address = re.search(r'"(/static/plotly\.min\.js[^"]*)"', ask.get("/").text)[1]
    plain = ask.get(address, headers={"Accept-Encoding": "identity"})
    assert plain.headers["content-type"] == "text/javascript; charset=utf-8"
    assert len(plain.content) > 1_000_000
    assert "immutable" in plain.headers["cache-control"]
    with ask.stream("GET", address, headers={"Accept-Encoding": "gzip"}) as packed:
        assert packed.headers["content-encoding"] == "gzip"
        assert gzip.decompress(b"".join(packed.iter_raw())) == plain.content
    again = ask.get(address, headers={"If-None-Match": plain.headers["etag"]})
    assert (again.status_code, again.content) == (304, b"")
    other = ask.get("/static/plotly.min.js?v=0")  # an address of another version must not be kept for good
    assert other.headers["cache-control"] == "no-cache"


def test_static_files_are_asked_about_before_they_are_used_again(ask: httpx.Client) -> None:
    first = ask.get("/static/app/main.js")
    assert first.headers["content-type"].startswith("text/javascript")
    assert first.headers["cache-control"] == "no-cache"
    assert ask.get("/static/app/main.js", headers={"If-None-Match": first.headers["etag"]}).status_code == 304


@pytest.mark.parametrize("path", ["/static/", "/static/nothing.js", "/static/../templates/workbench.html",
                                  "/static/%2e%2e/%2e%2e/pyproject.toml", "/static/..%2f..%2fserver/version.py",
                                  ])  # fmt: skip
def test_nothing_but_static_files_is_served(ask: httpx.Client, path: str) -> None:
    assert_refused(ask.get(path), 404)


@pytest.mark.parametrize(
    ("method", "path", "status"),
    [("GET", "/nothing", 404), ("GET", "/api/assessment", 405), ("PUT", "/api/designs/x", 405),
     ("POST", "/", 405), ("GET", "/api/designs", 405), ("GET", "/docs", 404), ("GET", "/live", 404)],
)  # fmt: skip
def test_what_is_not_there_is_told_in_the_same_shape(ask: httpx.Client, method: str, path: str, status: int) -> None:
    assert_refused(ask.request(method, path), status)


@pytest.mark.parametrize("kind", ["", "text/plain", "application/x-www-form-urlencoded", "multipart/form-data"])
def test_bodies_that_are_not_announced_as_json_are_refused(ask: httpx.Client, kind: str) -> None:
    answer = ask.post("/api/assessment", content=b"{}", headers={"Content-Type": kind} if kind else {})
    assert_refused(answer, 415, "", "application/json")


def test_json_with_a_charset_is_taken(ask: httpx.Client, plain_design: dict[str, Any]) -> None:
    answer = ask.post("/api/assessment", json=plain_design, headers={"Content-Type": "application/json; charset=UTF-8"})
    assert answer.status_code == 200
    assert_refused(ask.post("/api/assessment", content=b"\xff", headers=JSON), 422, "", "UTF-8")


def test_the_api_describes_itself_without_another_host(ask: httpx.Client) -> None:
    described = ask.get("/api/openapi.json").json()
    for path in ("/api/designs", "/api/designs/{token}", "/api/assessment", "/api/exports/{kind}", "/api/models",
                 "/api/stages", "/api/demos", "/api/demos/{name}", "/api/measures", "/api/schemas/{name}",
                 "/healthz"):  # fmt: skip
        assert path in described["paths"]
    page = ask.get("/api/docs")
    assert "POST /api/assessment" in page.text
    assert not re.search(r"""(src|href)=["'](https?:)?//""", page.text)
    for link in re.findall(r'href="(/[^"]*)"', page.text):
        assert ask.get(link).status_code == 200, link
