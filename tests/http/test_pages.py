"""What is read by GET: pages that load nothing, schemas that stand alone, the state of the service."""

from __future__ import annotations

import json
import re
from html.parser import HTMLParser
from typing import Any

import pytest
from jsonschema_rs import Draft202012Validator

from pathgate.web.endpoints import OPERATIONS
from pathgate.web.problems import PROBLEM_TYPES
from pathgate.web.settings import Settings
from tests.http.conftest import TINY_GRAPH, TRIAL, service_with


class Links(HTMLParser):
    """Collects ids, links and whatever else a page might load."""

    def __init__(self, text: str) -> None:
        super().__init__()
        self.ids: list[str] = []
        self.links: list[str] = []
        self.loads: list[tuple[str, dict[str, Any]]] = []
        self.feed(text)

    def handle_starttag(self, tag: str, attrs: list[tuple[str, str | None]]) -> None:
        said = dict(attrs)
        if said.get("id"):
            self.ids.append(str(said["id"]))
        if tag == "a":
            self.links.append(str(said["href"]))
        elif tag in ("script", "img", "iframe", "object", "embed", "form") or {"src", "href"} & said.keys():
            self.loads.append((tag, said))


def test_the_start_leads_to_the_reference(service):
    reply = service.get("/")
    assert (reply.status_code, reply.headers["Location"]) == (302, "/docs")


@pytest.mark.parametrize("path", ["/docs", *(each.reference for each in PROBLEM_TYPES.values())])
def test_a_page_loads_nothing_and_forbids_loading(service, path):
    reply = service.get(path)
    assert Links(reply.text).loads == [("link", {"rel": "icon", "href": "data:,"})]
    assert reply.headers["Content-Security-Policy"].startswith("default-src 'none'; style-src 'sha256-")
    assert not re.search(r"@import|url\(", reply.text)


@pytest.mark.parametrize("path", ["/docs", *(each.reference for each in PROBLEM_TYPES.values())])
def test_every_link_of_a_page_leads_somewhere(service, path):
    page = Links(service.get(path).text)
    assert len(page.ids) == len(set(page.ids))
    for link in page.links:
        target, _, anchor = link.partition("#")
        reply = service.get(target or path)
        assert reply.status_code in (200, 302), link
        if anchor:
            assert anchor in Links(reply.text).ids, link


def test_the_reference_shows_every_operation_with_its_members_and_a_command_to_copy(service):
    text = service.get("/docs").text
    for operation in OPERATIONS:
        assert f'id="{operation.name}"' in text
        assert f"curl -sS http://localhost{operation.path} " in text
        for member in operation.request_schema["properties"]:
            assert f"<code>{member}</code>" in text


def test_commands_name_the_server_that_the_page_came_from(service):
    text = service.get("/docs", headers={"Host": "checks.internal:9000"}).text
    assert "curl -sS http://checks.internal:9000/v1/" in text


def test_a_strange_host_is_not_repeated_on_the_page(service):
    for host in ('evil"><script>', "a b", "a'b"):
        reply = service.unchecked.get("/docs", headers={"Host": host})
        assert "<script" not in reply.text
        assert "127.0.0.1:8080" in reply.text or reply.status_code == 400


def test_words_of_operations_and_schemas_are_escaped():
    hostile = "<script>alert(1)</script> & `<b>`"
    operation = type(TRIAL)(
        **{
            **{name: getattr(TRIAL, name) for name in TRIAL.__dataclass_fields__},
            "summary": hostile,
            "description": hostile,
        }
    )
    text = service_with([operation]).get("/docs").text
    assert "<script>" not in text
    assert "<code>&lt;b&gt;</code>" in text


@pytest.mark.parametrize("slug", PROBLEM_TYPES)
def test_a_problem_has_a_page_that_says_what_to_do(service, slug):
    page = service.get(f"/problems/{slug}")
    assert page.headers["Content-Type"] == "text/html; charset=utf-8"
    assert PROBLEM_TYPES[slug].title in page.text
    document = service.get(f"/problems/{slug}", headers={"Accept": "application/json"})
    assert document.json["type"] == f"/problems/{slug}"
    assert 2 <= document.json["text"].count(". ") + 1 <= 5


@pytest.mark.parametrize("path", ["/problems/none", "/schemas/none", "/schemas/", "/problems/"])
def test_a_page_that_is_not_there_is_not_found(service, path):
    reply = service.get(path)
    assert (reply.status_code, json.loads(reply.data)["type"]) == (404, "/problems/not-found")


def test_a_schema_stands_by_itself_and_judges_what_it_names(service):
    schema = service.get("/schemas/graph").json
    assert schema["$schema"] == "https://json-schema.org/draft/2020-12/schema"
    assert Draft202012Validator(schema).is_valid(TINY_GRAPH)
    assert not Draft202012Validator(schema).is_valid({"nodes": []})


def test_every_schema_is_served_without_references_to_anything_outside(service):
    for name in service.document["components"]["schemas"]:
        path = "/schemas/" + re.sub(r"(?<=[a-z0-9])(?=[A-Z])", "-", name).lower()
        reply = service.get(path)
        assert reply.status_code == 200
        assert all(used.startswith("#/$defs/") for used in re.findall(r'"\$ref":"([^"]*)"', reply.text))
        Draft202012Validator(reply.json)


def test_the_state_is_told(service):
    assert service.get("/healthz").json == {"status": "ok"}
    assert service.get("/readyz").json == {"status": "ready"}


def test_the_version_is_told_with_the_limits_in_force(trial):
    told = trial.get("/version").json
    assert told["limits"] == Settings(max_body_bytes=4_000, max_depth=20, max_errors=5).as_dict()
    assert told["version"]


@pytest.mark.parametrize("path", ["/docs", "/openapi.json", "/healthz", "/schemas/graph", "/problems/cycle"])
def test_head_tells_the_headers_alone(service, path):
    reply = service.send("HEAD", path)
    assert (reply.status_code, reply.data) == (200, b"")
    assert int(reply.headers["Content-Length"]) == len(service.get(path).data)
