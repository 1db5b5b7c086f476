"""Joint cuts against every set of nodes, tried one by one on pairs of random graphs over the same nodes."""

from __future__ import annotations

import random
from collections import Counter
from fractions import Fraction

import pytest

from pathgate.criteria import Deadline, OutOfTime, Separators
from pathgate.criteria.joint_cuts import Cut, JointCuts
from pathgate.graphs import read_graph
from tests.brute import inclusion_minimal, subsets
from tests.strategies import PLAIN_NAMES, random_graph

# All subsets are tried on every graph: not for a quick look.
pytestmark = pytest.mark.slow

NODES = frozenset(PLAIN_NAMES[:8])


def random_cut(rng: random.Random, source: str) -> Cut:
    """A cut of ``source`` from b in a random graph, by some of its nodes; the nodes stand in order in each."""
    value = random_graph(rng, len(NODES), arrow=rng.choice([0.25, 0.35]), bidirected=0.05, unmeasured=0)
    graph = read_graph({**value, "nodes": sorted(value["nodes"], key=lambda node: node["id"])})
    allowed = graph.mask(name for name in sorted(NODES) if rng.random() < 0.85)
    return Cut.of(Separators(graph, graph.mask(source), graph.mask("b"), required=0, allowed=allowed))


@pytest.mark.parametrize("seeds", [range(400), pytest.param(range(400, 5000), marks=pytest.mark.slow)])
def test_the_least_joint_cut_and_the_nodes_it_needs(seeds: range):
    seen: Counter[str] = Counter()
    for seed in seeds:
        rng = random.Random(seed)
        joint = JointCuts((random_cut(rng, "a"), random_cut(rng, rng.choice(["a", "c"]))))
        places = [place for place in range(len(NODES)) if joint.choosable >> place & 1]
        costs = {place: Fraction(rng.choice([1, 1, 2, 3, 5]), 2) for place in places}
        sets = (sum(1 << int(place) for place in chosen) for chosen in subsets(map(str, places)))
        making = [mask for mask in sets if all(cut.is_made_by(mask) for cut in joint.cuts)]
        prices = [sum(costs[place] for place in places if mask >> place & 1) for mask in making]
        least = joint.least(costs, Deadline.never())
        assert (least is None) is (not making), seed
        if least is not None:
            assert least in making, seed
            assert sum(costs[place] for place in places if least >> place & 1) == min(prices), seed
        as_sets = [frozenset(place for place in places if mask >> place & 1) for mask in making]
        minimal = inclusion_minimal(as_sets)
        for mask, one in zip(making, as_sets, strict=True):
            assert (joint.needed(mask) == mask) is (one in minimal), seed
        for cut in joint.cuts:
            for mask in making:
                core = cut.core(mask)
                assert core & ~mask == 0, seed
                assert cut.is_made_by(core), seed
                assert cut.needed(core) == core, seed
        seen["none" if not making else "some" if min(prices) else "nothing to cut"] += 1
    assert min(seen.values()) > len(seeds) / 40


def test_the_search_polls_its_deadline():
    joint = JointCuts((random_cut(random.Random(1), "a"),))
    costs = {place: Fraction(1) for place in range(len(NODES))}
    moments = iter([0.0, 2.0])
    with pytest.raises(OutOfTime):
        joint.least(costs, Deadline(1, clock=lambda: next(moments)))
