"""Graphs to and from networkx, and networkx's own JSON read as it stands."""

from __future__ import annotations

import json

import networkx
import pytest
from hypothesis import given
from hypothesis import strategies as st

from pathgate.graphs import CausalGraph, InvalidGraph, edges_of, from_networkx, read_graph, to_networkx
from tests.strategies import small_graphs
from tests.values import Graph, node_names


def content(graph: CausalGraph) -> tuple:
    """Everything a graph holds."""
    said = (graph.costs, graph.recorded, graph.constant_within, graph.aliases, graph.notes)
    return (graph.names, edges_of(graph), graph.measured, graph.doubtful, *map(dict, said))


@st.composite
def annotated_graphs(draw: st.DrawFn) -> Graph:
    """Graphs whose nodes and edges carry all that the form allows."""
    value = draw(small_graphs(max_nodes=6))
    names = node_names(value)
    nodes = []
    for place, node in enumerate(value["nodes"]):
        said = {"id": node} if isinstance(node, str) else dict(node)
        if draw(st.booleans()):
            said["cost"] = draw(st.floats(min_value=1e-9, max_value=1e9, allow_nan=False))
        if draw(st.booleans()):
            said["columns"] = [f"alias {place}", f"alias {place} again"]
        if draw(st.booleans()):
            said["constant_within"] = draw(st.lists(st.sampled_from(names), max_size=3))
        if draw(st.booleans()):
            said["recorded"] = 7
        nodes.append(said)
    edges = [
        {**edge, "doubtful": draw(st.booleans()), **draw(st.sampled_from([{}, {"note": "team, 2026"}]))}
        for edge in value["edges"]
    ]
    return {"nodes": nodes, "edges": edges}


@given(value=annotated_graphs())
def test_there_and_back_everything_is_kept(value: Graph):
    graph = read_graph(value)
    assert content(from_networkx(to_networkx(graph))) == content(graph)


@given(value=annotated_graphs())
def test_the_json_that_networkx_writes_is_read_as_it_stands(value: Graph):
    graph = read_graph(value)
    written = json.dumps(networkx.node_link_data(to_networkx(graph), edges="edges"))
    assert content(read_graph(json.loads(written))) == content(graph)


@pytest.mark.parametrize("kind", [networkx.DiGraph, networkx.MultiDiGraph])
def test_plain_digraphs_are_taken_as_they_are(kind: type):
    plain = kind(name="lockers", year=2026)
    plain.add_node("moon", team="none")
    plain.add_edge("weather", "late", weight=3)
    plain.add_edge("late", "refund")
    written = networkx.node_link_data(plain, edges="edges")
    assert written["multigraph"] is (kind is networkx.MultiDiGraph)
    for graph in (read_graph(json.loads(json.dumps(written))), from_networkx(plain)):
        assert graph.names == ("moon", "weather", "late", "refund")
        assert edges_of(graph) == [("directed", 1, 2), ("directed", 2, 3)]


@pytest.mark.parametrize("kind", [networkx.Graph, networkx.MultiGraph])
def test_what_has_no_directions_is_refused(kind: type):
    with pytest.raises(InvalidGraph) as caught:
        from_networkx(kind([("a", "b")]))
    assert [fault.place for fault in caught.value.faults] == [("directed",)]


def test_what_networkx_allows_and_a_causal_graph_does_not_is_refused():
    parallel = networkx.MultiDiGraph([("a", "b"), ("a", "b")])
    numbered = networkx.DiGraph([(1, 2)])
    tuples = networkx.DiGraph([(("a", 1), ("b", 2))])
    odd = networkx.DiGraph()
    odd.add_node("a", mesured=False)
    unruly = networkx.DiGraph()
    unruly.add_node("a")
    unruly.nodes["a"][3] = "x"
    cyclic = networkx.DiGraph([("a", "b"), ("b", "a")])
    for plain in (parallel, numbered, tuples, odd, unruly, cyclic):
        with pytest.raises(InvalidGraph):
            from_networkx(plain)


def test_an_empty_graph_goes_there_and_back():
    assert content(from_networkx(to_networkx(CausalGraph.of()))) == content(CausalGraph.of())
