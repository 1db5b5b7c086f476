"""The graph itself: what it says of its edges, whatever their order, and how it is changed."""

from __future__ import annotations

import random

import numpy as np
import pytest
from hypothesis import given
from hypothesis import strategies as st

from pathgate.graphs import CausalGraph, InvalidGraph, PathgateError, edges_of, read_graph
from pathgate.graphs.graph import SMALL
from pathgate.graphs.masks import members
from tests.strategies import small_graphs
from tests.values import Graph, arrows_of, bidirected_of, measured_names, node_names, topological_names


def named_edges(graph: CausalGraph) -> set[tuple[str, str, str]]:
    """Every edge by names; of a bidirected one the ends sorted."""
    found = set()
    for kind, one, other in edges_of(graph):
        ends = (graph.name(one), graph.name(other))
        found.add((kind, *(sorted(ends) if kind == "bidirected" else ends)))
    return found


def edges_in(value: Graph) -> set[tuple[str, str, str]]:
    return {("directed", *arrow) for arrow in arrows_of(value)} | {
        ("bidirected", *sorted(ends)) for ends in bidirected_of(value)
    }


@given(value=small_graphs(max_nodes=7), data=st.data())
def test_a_graph_is_what_was_written_and_the_same_in_whatever_order_its_edges_come(
    value: Graph, data: st.DataObject
):
    graph = read_graph(value)
    assert list(graph.names) == node_names(value)
    assert list(graph.names_of(graph.measured)) == measured_names(value)
    assert named_edges(graph) == edges_in(value)
    rng = data.draw(st.randoms(use_true_random=False))
    moved = read_graph({**value, "edges": rng.sample(value["edges"], len(value["edges"]))})
    for attribute in ("sources", "targets", "lower_ends", "upper_ends"):
        assert np.array_equal(getattr(moved, attribute), getattr(graph, attribute))
    assert moved.child_lists == graph.child_lists
    assert moved.spouse_masks == graph.spouse_masks


@given(value=small_graphs(max_nodes=7))
def test_neighbours_are_those_of_the_edges_in_order(value: Graph):
    graph = read_graph(value)
    for node, name in enumerate(graph.names):
        children = {target for source, target in arrows_of(value) if source == name}
        parents = {source for source, target in arrows_of(value) if target == name}
        spouses = {end for ends in bidirected_of(value) if name in ends for end in ends} - {name}
        found = [graph.children(node), graph.parents(node), graph.spouses(node)]
        assert [{graph.name(other) for other in each} for each in found] == [children, parents, spouses]
        assert all(list(each) == sorted(set(each)) for each in found)
        masks = [graph.child_masks[node], graph.parent_masks[node], graph.spouse_masks[node]]
        assert [tuple(members(mask)) for mask in masks] == found
    order = [graph.name(node) for node in graph.topological_order]
    assert sorted(order) == sorted(topological_names(value) or [])
    assert all(order.index(source) < order.index(target) for source, target in arrows_of(value))


def test_a_large_graph_lists_the_same_neighbours_as_a_small_one():
    rng = random.Random(2)
    names = [f"n{k}" for k in range(40)]
    pairs = [(one, other) for k, one in enumerate(names) for other in names[k + 1 :]]
    arrows, bows = rng.sample(pairs, 120), rng.sample(pairs, 60)
    small = CausalGraph.of(*arrows, bidirected=bows, nodes=names)
    large = CausalGraph.of(*arrows, bidirected=bows, nodes=[*names, *(f"x{k}" for k in range(SMALL))])
    assert (small.is_small, large.is_small) == (True, False)
    for node in range(40):
        assert small.children(node) == large.children(node)
        assert small.parents(node) == large.parents(node)
        assert small.spouses(node) == large.spouses(node)
    assert all(large.children(node) == large.spouses(node) == () for node in range(40, large.size))


@given(value=small_graphs(max_nodes=6), data=st.data())
def test_taking_edges_away_takes_those_and_no_others(value: Graph, data: st.DataObject):
    graph = read_graph(value)
    some = st.sets(st.sampled_from(list(graph.names)))
    sources, targets = data.draw(some), data.draw(some)
    left = named_edges(graph.without_arrows(graph.mask(sources), graph.mask(targets)))
    gone = {
        edge
        for edge in edges_in(value)
        if edge[0] == "directed" and edge[1] in sources and edge[2] in targets
    }
    assert left == edges_in(value) - gone
    for edge in edges_of(graph):
        kind, one, other = edge
        ends = (graph.name(one), graph.name(other))
        named = (kind, *(sorted(ends) if kind == "bidirected" else ends))
        assert named_edges(graph.without_edge(edge)) == edges_in(value) - {named}
    assert named_edges(graph) == edges_in(value)


def test_leaves_are_unmeasured_nameless_and_last(parcel_chain):
    weather, refund = parcel_chain.mask("weather"), parcel_chain.mask("refund")
    grown = parcel_chain.with_leaves([weather | refund, refund])
    assert grown.names == (*parcel_chain.names, "", "")
    assert grown.parents(4) == (0, 3)
    assert grown.parents(5) == (3,)
    assert grown.measured == parcel_chain.measured
    assert grown.index == parcel_chain.index
    assert parcel_chain.size == 4


def test_names_become_masks_and_come_back_in_the_graphs_order(parcel_chain, raises_problem):
    assert parcel_chain.names_of(parcel_chain.mask(["refund", "weather"])) == ("weather", "refund")
    assert parcel_chain.mask("refund") == parcel_chain.mask(["refund"]) == 0b1000
    assert parcel_chain.mask([]) == 0
    with raises_problem("unknown-node", nodes=["wether", "vann"], nearest={"wether": "weather"}):
        parcel_chain.mask(["refund", "wether", "vann"])


def test_what_is_said_of_nodes_and_edges_is_kept():
    value = {
        "nodes": [
            {"id": "a", "cost": 2.5, "recorded": 1, "columns": ["t.a", "A"]},
            {"id": "b", "measured": False, "constant_within": ["a", "a"]},
            "c",
        ],
        "edges": [
            {"source": "c", "target": "b", "doubtful": True, "note": "team, 2026"},
            {"source": "b", "target": "a", "kind": "bidirected", "note": "both", "doubtful": False},
        ],
    }
    graph = read_graph(value)
    assert (graph.cost(0), graph.cost(1)) == (2.5, 1)
    assert graph.recorded == {0: 1}
    assert graph.constant_within == {1: (0,)}
    assert graph.aliases == {"t.a": 0, "A": 0}
    assert graph.doubtful == {("directed", 2, 1)}
    assert graph.notes == {("directed", 2, 1): "team, 2026", ("bidirected", 0, 1): "both"}


def test_pairs_make_a_graph_or_say_why_not():
    graph = CausalGraph.of(("a", "b"), bidirected=[("c", "a")], unmeasured=["b", "d"], nodes=["z"])
    assert graph.names == ("z", "a", "b", "c", "d")
    assert graph.names_of(graph.measured) == ("z", "a", "c")
    for arrows in ([("a", "a")], [("a", "b"), ("b", "a")], [("a", "b"), ("a", "b")]):
        with pytest.raises(InvalidGraph):
            CausalGraph.of(*arrows)
    assert issubclass(InvalidGraph, PathgateError)


def test_the_empty_graph_is_a_graph():
    graph = read_graph({"nodes": [], "edges": []})
    assert (graph.size, graph.measured, graph.topological_order, edges_of(graph)) == (0, 0, (), [])


def test_a_graph_cannot_be_changed(parcel_chain):
    with pytest.raises(AttributeError):
        parcel_chain.measured = 0
