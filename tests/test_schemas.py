"""The published JSON Schemas: those of the OpenAPI document, true of every example, and found by editors."""

from __future__ import annotations

import json
import re
from pathlib import Path
from typing import Any

import pytest
from click.testing import CliRunner
from jsonschema_rs import Draft202012Validator, meta

from pathgate.cli.main import main
from pathgate.cli.starting import write_starter
from pathgate.cli.yaml_text import read_yaml
from pathgate.demo import demo_configs, demo_graph
from pathgate.web.app import create_app
from pathgate.web.schema_documents import document_name
from pathgate.web.settings import Settings

ROOT = Path(__file__).parents[1]
EXAMPLES = ROOT / "deploy" / "examples" / "parcels"
DOCUMENT = json.loads((ROOT / "openapi" / "openapi.json").read_text("utf-8"))
COMPONENTS = DOCUMENT["components"]["schemas"]
BY_NAME = {document_name(name): name for name in COMPONENTS}
# Where bodies hold a graph, a config or a review, and in which schema.
MEMBERS = {
    "graph": "graph",
    "other": "graph",
    "config": "config",
    "configs": "config",
    "review": "review",
    "reviews": "review",
}


@pytest.fixture(scope="module")
def client():
    return create_app(Settings()).test_client()


@pytest.fixture(scope="module")
def served(client):
    """The document at /schemas/NAME."""
    return {name: client.get(f"/schemas/{name}").get_json(force=True) for name in BY_NAME}


@pytest.fixture(scope="module")
def validators(served):
    return {name: Draft202012Validator(served[name]) for name in ("graph", "config", "review")}


def resolved(schema: Any, definitions: dict[str, Any], within: tuple[str, ...] = ()) -> Any:
    """The schema with whatever it refers to in its place."""
    if isinstance(schema, list):
        return [resolved(part, definitions, within) for part in schema]
    if not isinstance(schema, dict):
        return schema
    said = {key: resolved(part, definitions, within) for key, part in schema.items() if key != "$ref"}
    if "$ref" not in schema:
        return said
    name = schema["$ref"].rpartition("/")[2]
    assert name not in within, "a schema that holds itself needs another comparison"
    return {**said, "$ref": resolved(definitions[name], definitions, (*within, name))}


def test_graph_config_and_verdict_are_among_them(served):
    assert {"graph", "config", "review"} <= served.keys()
    assert {"verdict", "findings", "remedies"} <= served["review"]["properties"].keys()


@pytest.mark.parametrize("name", [*BY_NAME])
def test_a_schema_is_the_openapi_component_of_its_name(served, name):
    document = dict(served[name])
    assert document.pop("$id") == f"/schemas/{name}"
    assert document.pop("$schema") == "https://json-schema.org/draft/2020-12/schema"
    definitions = document.pop("$defs", {})
    assert resolved(document, definitions) == resolved(COMPONENTS[BY_NAME[name]], COMPONENTS)
    # It stands by itself: whatever it refers to is in it.
    assert set(re.findall(r'"\$ref": "([^"]*)"', json.dumps(served[name]))) == {
        f"#/$defs/{each}" for each in definitions
    }


@pytest.mark.parametrize("name", [*BY_NAME])
def test_a_schema_is_one(served, name):
    meta.validate(served[name])


def parts(value: Any, member: str = ""):
    """Each graph, config and review in a body, with its schema; what is no object is asked about nowhere."""
    held = value if isinstance(value, list) else [value]
    for each in held:
        if not isinstance(each, dict):
            continue
        is_line = "index" in each
        if member in MEMBERS and not is_line:
            yield MEMBERS[member], each
            continue
        for name, part in each.items():
            yield from parts(part, name)


def examples():
    for path, said in DOCUMENT["paths"].items():
        post = said.get("post")
        if post is None:
            continue
        asked = post["requestBody"]["content"]["application/json"]["examples"]
        answers = post["responses"]["200"]["content"]["application/json"]["examples"]
        for name in asked:
            yield pytest.param(path, asked[name]["value"], answers[name]["value"], id=f"{path}-{name}")


@pytest.mark.parametrize(("path", "request_body", "answer"), [*examples()])
def test_every_graph_config_and_verdict_of_the_examples_follows_its_schema(
    validators, path, request_body, answer
):
    found = list(parts(request_body))
    if path == "/v1/review":
        found.append(("review", answer))
    if path == "/v1/reviews":
        found += parts(answer)
    assert found
    for name, value in found:
        # What is to be reported as faulty is faulty on purpose.
        if path == "/v1/graph-check" and not answer_is_clean(answer):
            continue
        validators[name].validate(value)


def answer_is_clean(answer: dict[str, Any]) -> bool:
    return not answer["findings"]


def test_the_demo_and_its_verdicts_follow_their_schemas(validators, client):
    validators["graph"].validate(demo_graph())
    for config in demo_configs():
        validators["config"].validate(config)
        reply = client.post("/v1/review", json={"graph": demo_graph(), "config": config})
        validators["review"].validate(reply.get_json())


def test_what_is_misspelt_is_marked_in_an_editor(validators):
    config = {"treatment": "rain", "outcome": "refund", "covariats": []}
    assert not validators["config"].is_valid(config)
    assert not validators["graph"].is_valid(
        {"nodes": ["rain"], "edges": [{"source": "rain", "to": "refund"}]}
    )


def test_a_graph_or_config_in_json_may_name_its_schema_to_editors(validators, client):
    graph = {"$schema": "schemas/graph.json", **demo_graph()}
    config = {"$schema": "schemas/config.json", **demo_configs()[0]}
    validators["graph"].validate(graph)
    validators["config"].validate(config)
    named = client.post("/v1/review", json={"graph": graph, "config": config})
    plain = client.post("/v1/review", json={"graph": demo_graph(), "config": demo_configs()[0]})
    assert (named.status_code, named.data) == (200, plain.data)


def commented(file: Path) -> str:
    """Where the comment for editors says that the schema is."""
    comment, address = file.read_text("utf-8").splitlines()[0].split("$schema=")
    assert comment == "# yaml-language-server: "
    return address


def yaml_files(folder: Path) -> list[Path]:
    return sorted(folder.rglob("*.yaml"))


def test_the_starter_s_files_follow_the_schemas_that_their_comments_name(tmp_path, validators, served):
    write_starter(tmp_path)
    files = yaml_files(tmp_path)
    assert len(files) > 1
    for file in files:
        schema = file.parent / commented(file)
        name = schema.stem
        assert json.loads(schema.read_text("utf-8")) == served[name]
        validators[name].validate(read_yaml(file.read_text("utf-8"), 20))
    assert {(file.parent / commented(file)).stem for file in files} == {"graph", "config"}


def test_the_recipes_files_follow_the_schemas_that_their_comments_name(validators, served):
    files = yaml_files(EXAMPLES)
    assert len(files) == 3
    for file in files:
        name = commented(file).removeprefix("http://127.0.0.1:8080/schemas/")
        assert name == ("graph" if file.name == "graph.yaml" else "config")
        validators[name].validate(read_yaml(file.read_text("utf-8"), 20))


@pytest.mark.parametrize("name", ["graph", "config", "review"])
def test_the_command_prints_the_document_of_the_service(served, name):
    result = CliRunner().invoke(main, ["schema", name])
    assert (result.exit_code, result.stderr) == (0, "")
    assert json.loads(result.stdout) == served[name]
    assert list(json.loads(result.stdout)) == list(served[name])


def test_the_command_lists_the_schemas_and_names_the_nearest(served):
    assert CliRunner().invoke(main, ["schema"]).stdout.splitlines() == sorted(served)
    refused = CliRunner().invoke(main, ["schema", "confg"])
    assert (refused.exit_code, refused.stdout) == (2, "")
    assert "'confg'" in refused.stderr
    assert '"config"' in refused.stderr
