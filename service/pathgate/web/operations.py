"""What an operation is, and one call of it: the question as it reached us, checked as far as its schema goes.

An operation is declared once, as data: its two schemas are published and enforced, its examples are published
and replayed. Graphs, the one part of a request that can be large, are kept away from the schema library:
reading them checks their shape in bulk.
"""

from __future__ import annotations

from collections.abc import Callable, Iterator, Mapping
from dataclasses import dataclass, field
from typing import Any

from pathgate.criteria.deadline import Deadline
from pathgate.graphs.errors import Fault
from pathgate.review.shape import Shape, are_cut_off
from pathgate.web.problems import Refused
from pathgate.web.settings import Settings

Json = dict[str, Any]
Schema = Mapping[str, Any]

GRAPH_REFERENCE = {"$ref": "#/components/schemas/Graph"}
# Items that are judged one by one: a faulty config is no fault of the request. The first schema takes anything at once.
CONFIGS_APART = {"anyOf": [{}, {"$ref": "#/components/schemas/Config"}]}


@dataclass(frozen=True, slots=True)
class Example:
    """One request worth copying; its answer is computed when the document is written, and replayed by a test.

    Attributes:
        name: its key in the OpenAPI document, kebab-case.
        summary: one line on what it asks.
        request: the body.
    """

    name: str
    summary: str
    request: Json


@dataclass(frozen=True, slots=True)
class Operation:
    """``POST /v1/<name>``.

    Attributes:
        name: the last step of its path, kebab-case.
        summary: one line on what it is for.
        description: what it means exactly (Markdown).
        request_schema: JSON Schema of the body; a member that is a graph is ``GRAPH_REFERENCE``.
        response_schema: JSON Schema of the answer.
        examples: at least one.
        answer: computes the answer, whose members leave in the order in which it holds them.
        lines: computes the answer line by line, for callers that take it as it comes; None where there is no such form.
        line_schema: JSON Schema of a line.
        failures: further statuses that it may end in, each with the slugs of its problems.
        components: further schemas that the two refer to as ``#/components/schemas/<Name>``.
    """

    name: str
    summary: str
    description: str
    request_schema: Schema
    response_schema: Schema
    examples: tuple[Example, ...]
    answer: Callable[[Call], Json]
    lines: Callable[[Call], Iterator[Json]] | None = None
    line_schema: Schema | None = None
    failures: Mapping[int, tuple[str, ...]] = field(default_factory=dict)
    components: Mapping[str, Schema] = field(default_factory=dict)

    @property
    def path(self) -> str:
        """Where it is served."""
        return f"/v1/{self.name}"

    @property
    def graph_members(self) -> tuple[str, ...]:
        """The members of a request that are graphs."""
        parts = self.request_schema.get("properties", {}).items()
        return tuple(member for member, part in parts if _is_graph(part))


@dataclass(frozen=True, slots=True, eq=False)
class Call:
    """One request to an operation, its envelope checked and its graphs not yet read.

    Attributes:
        body: the members whose shape is right, without graphs; a member with a fault anywhere in it is
            left out, so that what is here can be used without looking twice.
        graphs: the members that are graphs, as they came. Where one that is required is not among them,
            that is among the faults already.
        faults: all that is wrong so far. Whoever reads on adds to it, and then calls ``refuse_faults``.
        settings: the limits in force.
        deadline: how much time there is.
        whole: all of the body, faulty members included, without graphs.
    """

    body: Mapping[str, Any]
    graphs: Mapping[str, Any]
    faults: list[Fault]
    settings: Settings
    deadline: Deadline
    whole: Mapping[str, Any]

    @property
    def graph(self) -> Any:
        """The member ``graph`` as it came; None where there was none."""
        return self.graphs.get("graph")

    def is_sound(self, *place: str | int) -> bool:
        """No fault has been found at or below ``place``."""
        return not any(fault.place[: len(place)] == place for fault in self.faults)

    def sound_items(self, member: str) -> Iterator[tuple[int, Any]]:
        """The items of a list that have no fault in them, each with its index, even where others have one."""
        items = self.whole.get(member)
        if isinstance(items, list):
            below = [fault.place[1:] for fault in self.faults if fault.place[:1] == (member,)]
            faulty = {steps[0] for steps in below if steps}
            yield from ((index, item) for index, item in enumerate(items) if index not in faulty)

    def refuse_faults(self) -> None:
        """Go on where nothing is wrong.

        Raises:
            Refused: something is.
        """
        if self.faults:
            raise Refused(self.faults)


def envelope_shape(operation: Operation) -> Shape:
    """The shape of a request of ``operation`` whatever its graphs, ready to check many."""
    schema = _graphs_taken_out(operation.request_schema)
    components = {name: _graphs_taken_out(each) for name, each in operation.components.items()}
    return Shape({**schema, "components": {"schemas": components}})


def open_call(operation: Operation, shape: Shape, value: Any, settings: Settings, deadline: Deadline) -> Call:
    """The call that a parsed body makes, its envelope checked against ``shape``.

    Raises:
        Refused: the body is no object, or so faulty that not all of its faults were looked for.
    """
    if not isinstance(value, dict):
        raise Refused(shape.faults(value))
    graphs = {member: value[member] for member in operation.graph_members if member in value}
    whole = {member: said for member, said in value.items() if member not in graphs}
    faults = shape.faults({**whole, **dict.fromkeys(graphs)})
    if are_cut_off(faults):
        raise Refused(faults)
    faulty = {fault.place[0] for fault in faults if fault.place}
    body = {member: said for member, said in whole.items() if member not in faulty} if faulty else whole
    return Call(
        body=body,
        graphs=graphs,
        faults=faults,
        settings=settings,
        deadline=deadline,
        whole=whole,
    )


def _graphs_taken_out(schema: Any) -> Any:
    """The schema with every reference to a graph replaced by "anything"."""
    if _is_graph(schema):
        return True
    if isinstance(schema, Mapping):
        return {key: _graphs_taken_out(each) for key, each in schema.items()}
    if isinstance(schema, list | tuple):
        return [_graphs_taken_out(each) for each in schema]
    return schema


def _is_graph(schema: Any) -> bool:
    return isinstance(schema, Mapping) and schema.get("$ref") == GRAPH_REFERENCE["$ref"]
