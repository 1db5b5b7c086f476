"""The OpenAPI document: valid, up to date in the repository, and true in every example."""

from __future__ import annotations

import json
import sys
from pathlib import Path
from typing import Any

import pytest
from openapi_spec_validator import OpenAPIV31SpecValidator, validate

from pathgate.web import openapi
from pathgate.web.endpoints import OPERATIONS
from pathgate.web.problems import PROBLEM_TYPES

COMMITTED = Path(__file__).parents[2] / "openapi" / "openapi.json"
DOCUMENT = json.loads(COMMITTED.read_text(encoding="utf-8"))
EXAMPLES = [
    pytest.param(path, name, id=f"{path}-{name}")
    for path, said in DOCUMENT["paths"].items()
    if "post" in said
    for name in said["post"]["requestBody"]["content"]["application/json"]["examples"]
]


def unversioned(document: dict[str, Any]) -> dict[str, Any]:
    """The document without the version, which a source tree that is not installed cannot tell."""
    return {**document, "info": {**document["info"], "version": None}}


def test_the_committed_document_is_valid_openapi():
    validate(DOCUMENT, cls=OpenAPIV31SpecValidator)


def test_the_committed_document_is_what_the_operations_make():
    # Where this fails: python -m pathgate.web.openapi --write openapi/openapi.json
    assert unversioned(openapi.document(OPERATIONS)) == unversioned(DOCUMENT)
    assert COMMITTED.read_text(encoding="utf-8") == json.dumps(DOCUMENT, indent=2, ensure_ascii=False) + "\n"


def test_the_service_serves_the_document_that_is_committed(service):
    assert unversioned(service.get("/openapi.json").json) == unversioned(DOCUMENT)


@pytest.mark.parametrize(("path", "name"), EXAMPLES)
def test_an_example_request_gets_exactly_its_example_answer(service, path, name):
    said = DOCUMENT["paths"][path]["post"]
    request = said["requestBody"]["content"]["application/json"]["examples"][name]["value"]
    answer = said["responses"]["200"]["content"]["application/json"]["examples"][name]["value"]
    reply = service.post(path, request)
    assert (reply.status_code, json.loads(reply.data)) == (200, answer)


def test_every_operation_has_an_example_and_says_what_it_is_for():
    for operation in OPERATIONS:
        assert operation.examples
        assert operation.summary
        assert operation.description


def test_every_reference_leads_somewhere():
    names = [*DOCUMENT["components"]["schemas"], *DOCUMENT["components"]["responses"]]
    text = COMMITTED.read_text(encoding="utf-8")
    used = {part.split('"')[0].rpartition("/")[2] for part in text.split('"$ref": "')[1:]}
    assert used <= {*names, *DOCUMENT["components"]["headers"]}


def test_every_kind_of_problem_that_an_operation_can_end_in_is_documented_once():
    answers = DOCUMENT["components"]["responses"].values()
    schemas = [answer["content"]["application/problem+json"]["schema"]["allOf"][1] for answer in answers]
    documented = [reference for schema in schemas for reference in schema["properties"]["type"]["enum"]]
    assert len(documented) == len(set(documented))
    # The others belong to paths and methods that are in no document, to a server about to stop, or to one operation.
    others = {"/problems/not-found", "/problems/method-not-allowed", "/problems/overloaded"}
    others |= {
        PROBLEM_TYPES[slug].reference
        for each in OPERATIONS
        for slugs in each.failures.values()
        for slug in slugs
    }
    assert {*documented} | others == {each.reference for each in PROBLEM_TYPES.values()}


def test_the_command_prints_the_document_or_writes_it(tmp_path, capsys):
    openapi.main([])
    printed = capsys.readouterr().out
    openapi.main(["--write", str(tmp_path / "openapi.json")])
    assert (tmp_path / "openapi.json").read_text(encoding="utf-8") == printed
    assert json.loads(printed)["openapi"].startswith("3.1.")
    assert "pathgate.web.openapi" in sys.modules
