"""What sets of nodes lead to stays the same however often a graph is asked, on deep and on wide graphs too."""

from __future__ import annotations

import random
from dataclasses import replace

from pathgate.graphs import ancestors, descendants, read_graph
from pathgate.graphs.closures import Closures
from pathgate.graphs.graph import SMALL
from tests.strategies import random_graph
from tests.values import arrows_of, node_names


def reached(arrows: list[tuple[str, str]], starts: set[str], avoiding: set[str]) -> set[str]:
    """By definition: step after step along the arrows, never into what is to be avoided."""
    found = set(starts)
    while new := {end for begin, end in arrows if begin in found} - found - avoiding:
        found |= new
    return found


def test_the_first_question_and_later_ones_are_answered_by_definition():
    stopped = 0
    for seed in range(300):
        rng = random.Random(seed)
        value = random_graph(rng, rng.randint(1, 9), arrow=0.3, bidirected=0.1)
        graph, names, arrows = read_graph(value), node_names(value), arrows_of(value)
        turned = [(target, source) for source, target in arrows]
        for _question in range(8):
            starts = {name for name in names if rng.random() < 0.25}
            avoiding = {name for name in names if rng.random() < rng.choice([0, 0.3])}
            masks = graph.mask(starts), graph.mask(avoiding)
            below, above = reached(arrows, starts, avoiding), reached(turned, starts, avoiding)
            assert graph.names_of(descendants(graph, masks[0], avoiding=masks[1])) == in_order(names, below)
            assert graph.names_of(ancestors(graph, masks[0], avoiding=masks[1])) == in_order(names, above)
            stopped += below != reached(arrows, starts, set())
    assert stopped > 100


def in_order(names: tuple[str, ...] | list[str], chosen: set[str]) -> tuple[str, ...]:
    return tuple(name for name in names if name in chosen)


def test_a_chain_as_long_as_masks_are_made_for_needs_no_recursion():
    chain = Closures([*(1 << node + 1 for node in range(SMALL - 1)), 0])
    for _question in range(5):
        for start in (0, SMALL // 2, SMALL - 1):
            assert chain.reached(1 << start) == (1 << SMALL) - (1 << start)


def test_each_node_next_to_a_hub_is_looked_at_once():
    class Counting(list[int]):
        """Next nodes that count how often they are looked up."""

        looked_up = 0

        def __getitem__(self, node):
            self.looked_up += 1
            return super().__getitem__(node)

    size = 500
    everything = (1 << size) - 1
    # order0 → all others, and each of those → the last
    nodes = Counting([everything - 1, *(1 << size - 1 for _ in range(size - 2)), 0])
    hub = Closures(nodes)
    for _question in range(10):
        assert hub.reached(1) == everything
    assert nodes.looked_up < 4 * size


def test_leaves_are_reached_as_in_the_same_graph_made_anew():
    for seed in range(300):
        rng = random.Random(seed)
        graph = read_graph(random_graph(rng, rng.randint(1, 8), arrow=0.3, bidirected=0.1))
        sets = [rng.getrandbits(graph.size) for _leaf in range(rng.randint(1, 3))]
        grown = graph.with_leaves(sets).with_leaves([rng.getrandbits(graph.size)])
        # A copy knows nothing of what was carried over.
        anew = replace(grown)
        assert (grown.child_masks, grown.parent_masks) == (anew.child_masks, anew.parent_masks)
        assert grown.spouse_masks == anew.spouse_masks
        for _question in range(12):
            nodes = rng.getrandbits(grown.size)
            avoiding = rng.getrandbits(grown.size) & rng.getrandbits(grown.size) if rng.random() < 0.5 else 0
            assert ancestors(grown, nodes, avoiding=avoiding) == ancestors(anew, nodes, avoiding=avoiding), (
                seed
            )
            assert descendants(grown, nodes, avoiding=avoiding) == descendants(
                anew, nodes, avoiding=avoiding
            ), seed


def test_a_cycle_ends_no_search():
    # 0 → 1 → 2 → 0, 2 → 3
    circle = Closures([0b0010, 0b0100, 0b1001, 0b0000])
    for _question in range(4):
        assert [circle.reached(1 << node) for node in range(4)] == [0b1111, 0b1111, 0b1111, 0b1000]
