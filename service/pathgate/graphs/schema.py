"""The shape of a graph, as JSON Schema 2020-12: pure data, published with the interface.

``reading`` checks the same in bulk, and what no schema can say besides: that names are known and different,
that arrows run in no circle. The descriptions are what the reference shows.
"""

from __future__ import annotations

from typing import Any

from pathgate.graphs.node_list import MAX_NAME

Schema = dict[str, Any]

NODE_NAME: Schema = {
    "title": "a name",
    "description": f"The name of a node: any string of 1 to {MAX_NAME} characters, matched exactly.",
    "type": "string",
    "minLength": 1,
    "maxLength": MAX_NAME,
    "examples": ["late_pickup"],
}

NODE_SCHEMA: Schema = {
    "title": "a node",
    "description": (
        "A column, or something that no column holds. Members not listed here are attributes of your own and are"
        " not read; one within two letters of `measured`, `recorded`, `columns` or `constant_within` is refused"
        " as a misspelling."
    ),
    "type": "object",
    "properties": {
        "id": {**NODE_NAME, "description": "Its name, different from all others in the graph."},
        "measured": {
            "type": "boolean",
            "default": True,
            "description": "Does the platform hold this column? Where not, no answer ever asks to adjust for it.",
        },
        "cost": {
            "type": "number",
            "exclusiveMinimum": 0,
            "default": 1,
            "description": "What it costs to use the column, in any unit; cheaper sets are offered first.",
        },
        "recorded": {
            "type": "integer",
            "description": (
                "When the column is recorded, on any scale of whole numbers. An arrow from a later to an earlier"
                " column is a fault."
            ),
        },
        "constant_within": {
            "type": "array",
            "title": "a list of names",
            "items": {"type": "string"},
            "description": (
                "Nodes within each value of which this one has a single value, each a claim of its own:"
                " `locker_size` is constant within `locker`."
            ),
        },
        "columns": {
            "type": "array",
            "title": "a list of names",
            "items": NODE_NAME,
            "description": "Further names that the same column goes by in configs, filters and formulas.",
        },
    },
    "required": ["id"],
}

EDGE_SCHEMA: Schema = {
    "title": "an edge",
    "description": (
        "An arrow from a cause to what it acts on, or a sign that two columns share a cause nobody measured."
        " Members not listed here are attributes of your own and are not read; one within two letters of `source`,"
        " `target` or `doubtful` is refused as a misspelling."
    ),
    "type": "object",
    "properties": {
        "source": {**NODE_NAME, "description": "The node it starts at; it must be declared under `nodes`."},
        "target": {**NODE_NAME, "description": "The node it points to; it must be declared under `nodes`."},
        "kind": {
            "enum": ["directed", "bidirected"],
            "default": "directed",
            "description": (
                "`directed`: source is a direct cause of target. `bidirected`: an unmeasured common cause of both"
                " ends. One of each may join the same two nodes."
            ),
        },
        "doubtful": {
            "type": "boolean",
            "default": False,
            "description": "The team is not sure of this edge.",
        },
        "note": {
            "type": "string",
            "description": "Where the edge comes from; shown where an answer rests on it.",
        },
        "key": {"description": "Read past: graph libraries write it beside the edges of multigraphs."},
    },
    "required": ["source", "target"],
}

GRAPH_SCHEMA: Schema = {
    "title": "a graph",
    "description": (
        "A causal graph as node-link JSON, the form that graph libraries and drawing libraries write. It must"
        " have no directed cycle, no edge from a node to itself, and no edge twice."
    ),
    "type": "object",
    "properties": {
        "$schema": {"type": "string", "description": "For editors; not read."},
        "nodes": {
            "type": "array",
            "title": "a list of nodes",
            "items": {"title": "a name or a node", "anyOf": [NODE_NAME, NODE_SCHEMA]},
            "description": (
                "All nodes, each an object or, where nothing but the name is to be said, a string. Answers list"
                " sets of columns in this order."
            ),
        },
        "edges": {
            "type": "array",
            "title": "a list of edges",
            "items": EDGE_SCHEMA,
            "description": "All edges. Their ends must be declared, so that a typo never becomes a column.",
        },
        "directed": {
            "const": True,
            "default": True,
            "description": "Written by graph libraries; a graph without directions says nothing about causes.",
        },
        "multigraph": {
            "type": "boolean",
            "description": "Written by graph libraries; read past.",
        },
        "graph": {
            "type": "object",
            "description": "Attributes of the whole graph, of your own; read past.",
        },
    },
    "required": ["nodes", "edges"],
    "additionalProperties": False,
    "examples": [
        {
            "nodes": [
                "courier_delay",
                {"id": "weather", "measured": False},
                {"id": "late_pickup", "recorded": 2},
            ],
            "edges": [
                {"source": "weather", "target": "courier_delay"},
                {"source": "weather", "target": "late_pickup"},
                {"source": "courier_delay", "target": "late_pickup", "note": "operations, spring review"},
            ],
        }
    ],
}
