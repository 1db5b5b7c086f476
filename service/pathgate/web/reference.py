"""The reference as pages: what each operation is for, its members, examples, kinds of problems, rules, roles.

Made from the OpenAPI document and the tables of problems and rules alone, so that pages and answers cannot
disagree. A page is one file: its style is in it, it needs no script, and its content policy lets it load nothing.
"""

from __future__ import annotations

import base64
import hashlib
import json
import shlex
from collections.abc import Iterator, Mapping
from dataclasses import dataclass
from pathlib import Path
from typing import TYPE_CHECKING, Any

from pathgate.review.roles import ROLES
from pathgate.review.rules import RULES, SEVERITIES, Rule
from pathgate.web.problems import PROBLEM_TYPES, ProblemType
from pathgate.web.schema_documents import document_name

if TYPE_CHECKING:
    from jinja2 import Environment

# Stands in the commands for the server's address until a request tells it.
ANY_SERVER = "http://127.0.0.1:8080/"

_REFERENCE = "#/components/schemas/"
_STYLE = Path(__file__).parent / "templates" / "style.css"


@dataclass(frozen=True, slots=True)
class Member:
    """One row of a table of members: where it stands (``statements[].x``) and its schema."""

    path: str
    schema: Mapping[str, Any]
    is_required: bool


@dataclass(frozen=True, slots=True)
class ShownExample:
    """An example request as a command, and its answer."""

    summary: str
    command: str
    answer: str


@dataclass(frozen=True, slots=True)
class Question:
    """An operation as the page shows it."""

    path: str
    name: str
    summary: str
    description: str
    request: tuple[Member, ...]
    answer: tuple[Member, ...]
    not_yet: tuple[str, ...]
    examples: tuple[ShownExample, ...]
    statuses: tuple[str, ...]


class Pages:
    """Makes the pages from the OpenAPI document ``described`` with the templates of ``environment``."""

    def __init__(self, environment: Environment, described: Mapping[str, Any]) -> None:
        self._environment = environment
        self._described = described
        self._style = _STYLE.read_text(encoding="utf-8")
        # The hash is of what stands between the tags, and no other style runs.
        digest = base64.b64encode(hashlib.sha256(self._style.encode()).digest()).decode()
        self.content_policy = (
            f"default-src 'none'; style-src 'sha256-{digest}'; img-src data:; base-uri 'none';"
            " form-action 'none'; frame-ancestors 'none'"
        )

    def reference(self) -> str:
        """The page at ``/docs``."""
        paths = self._described["paths"]
        return self._rendered(
            "docs.html",
            info=self._described["info"],
            questions=[self._question(path, said["post"]) for path, said in paths.items() if "post" in said],
            gets=[(path, said["get"]) for path, said in paths.items() if "get" in said],
            shapes=self._shapes(),
            problems=list(PROBLEM_TYPES.values()),
        )

    def problem(self, problem: ProblemType) -> str:
        """The page at ``/problems/<slug>``."""
        return self._rendered("problem.html", problem=problem)

    def rule(self, rule: Rule) -> str:
        """The page at ``/docs/rules/<rule>``."""
        return self._rendered("rule.html", rule=rule, severity_means=SEVERITIES[rule.severity])

    def rules(self) -> str:
        """The page at ``/docs/rules``."""
        groups = [
            (severity, means, [rule for rule in RULES.values() if rule.severity == severity])
            for severity, means in SEVERITIES.items()
        ]
        return self._rendered("rules.html", groups=groups)

    def roles(self) -> str:
        """The page at ``/docs/roles``."""
        return self._rendered("roles.html", roles=ROLES)

    def _rendered(self, template: str, **context: Any) -> str:
        return self._environment.get_template(template).render(
            style=self._style, anchor=document_name, bounds=bounds, shown=json.dumps, **context
        )

    def _question(self, path: str, said: Mapping[str, Any]) -> Question:
        asked = said["requestBody"]["content"]["application/json"]
        answered = said["responses"]["200"]["content"]["application/json"]
        request, answer = self._schema(asked["schema"]), self._schema(answered["schema"])
        return Question(
            path=path,
            name=said["operationId"],
            summary=said["summary"],
            description=said["description"],
            request=tuple(members_of(request)),
            answer=tuple(members_of(answer)),
            not_yet=tuple(request.get("x-not-yet", ())),
            examples=tuple(
                ShownExample(
                    each["summary"],
                    _command(path, each["value"]),
                    compact(answered["examples"][name]["value"]),
                )
                for name, each in asked["examples"].items()
            ),
            statuses=tuple(said["responses"]),
        )

    def _schema(self, schema: Mapping[str, Any]) -> Any:
        """The schema itself, where a reference stands for it (or a reference to a reference)."""
        while "$ref" in schema:
            schema = self._described["components"]["schemas"][schema["$ref"].removeprefix(_REFERENCE)]
        return schema

    def _shapes(self) -> list[tuple[str, Mapping[str, Any], tuple[Member, ...]]]:
        """The named schemas that operations share: name, schema, members."""
        return [
            (name, schema, tuple(members_of(schema)))
            for name, schema in self._described["components"]["schemas"].items()
            if not name.endswith(("Request", "Answer"))
        ]


def members_of(schema: Mapping[str, Any], prefix: str = "") -> Iterator[Member]:
    """Every member of an object and of the unnamed objects in it; a named schema is left to its own table."""
    required = schema.get("required", ())
    for name, part in schema.get("properties", {}).items():
        if not isinstance(part, Mapping):
            continue
        path = f"{prefix}{name}"
        yield Member(path, part, name in required)
        yield from _members_within(part, path)


def _members_within(schema: Mapping[str, Any], path: str) -> Iterator[Member]:
    if "properties" in schema:
        yield from members_of(schema, f"{path}.")
    elif isinstance(schema.get("items"), Mapping):
        yield from _members_within(schema["items"], f"{path}[]")
    else:
        for branch in schema.get("anyOf", ()):
            yield from _members_within(branch, path)


def bounds(schema: Mapping[str, Any]) -> str:
    """The bounds a schema sets, in words; empty where it sets none.

    >>> bounds({"type": "string", "minLength": 1, "maxLength": 200}), bounds({"exclusiveMinimum": 0})
    ('1 to 200 characters', 'more than 0')
    """
    said = [
        _range(schema, "minLength", "maxLength", " character"),
        _range(schema, "minItems", "maxItems", " item"),
        _range(schema, "minimum", "maximum", ""),
        f"more than {schema['exclusiveMinimum']}" if "exclusiveMinimum" in schema else "",
    ]
    return ", ".join(filter(None, said))


def _range(schema: Mapping[str, Any], least: str, most: str, of_what: str) -> str:
    if least not in schema and most not in schema:
        return ""
    highest = schema.get(most, schema.get(least))
    plural = "s" if of_what and highest != 1 else ""
    if least in schema and most in schema:
        return f"{schema[least]:,} to {highest:,}{of_what}{plural}"
    return f"at {'least' if least in schema else 'most'} {highest:,}{of_what}{plural}"


def compact(value: Any, indent: str = "", width: int = 96) -> str:
    """JSON for people: what fits on a line stands on one.

    >>> print(compact({"nodes": ["a", "b"], "note": "x" * 90}))  # doctest: +ELLIPSIS
    {
      "nodes": ["a", "b"],
      "note": "xxx...xxx"
    }
    """
    flat = json.dumps(value, ensure_ascii=False)
    if not isinstance(value, dict | list) or not value or len(indent) + len(flat) <= width:
        return flat
    inner = indent + "  "
    if isinstance(value, dict):
        names = (json.dumps(name, ensure_ascii=False) for name in value)
        lines = [
            f"{name}: {compact(each, inner, width)}" for name, each in zip(names, value.values(), strict=True)
        ]
    else:
        lines = [compact(each, inner, width) for each in value]
    opening, closing = "{}" if isinstance(value, dict) else "[]"
    return f"{opening}\n{inner}" + f",\n{inner}".join(lines) + f"\n{indent}{closing}"


def _command(path: str, request: Any) -> str:
    address = ANY_SERVER + path.removeprefix("/")
    return f"curl -sS {address} -H 'Content-Type: application/json' -d {shlex.quote(compact(request))}"
