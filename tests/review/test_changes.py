"""What a change of graph does to configs, held against reviewing each graph in between, and what it promises."""

from __future__ import annotations

import random
from collections import Counter
from collections.abc import Iterator, Sequence
from itertools import chain, combinations
from typing import Any

import pytest

from pathgate.criteria import Deadline
from pathgate.criteria.errors import OutOfTime
from pathgate.graphs import InvalidGraph, read_graph
from pathgate.review import InvalidConfig, read_config, review
from pathgate.review.change_words import change_sentence
from pathgate.review.changed_promises import BrokenPromises
from pathgate.review.changes import MOST_CULPRITS, ConfigChange, change_of, judge
from pathgate.review.culprits import least_changes
from pathgate.review.graph_difference import Difference, NodeChange
from tests.brute import ancestors, separated
from tests.review.random_changes import changed_graph, edges_of, graph_with
from tests.review.random_configs import random_config
from tests.review.random_pipelines import random_pipeline
from tests.strategies import random_graph, shuffled
from tests.values import Graph, arrows_of, bidirected_of, graph_of, is_adjacent, measured_names, node_names

SEEDS = range(400)
# weather → late → refund, weather → refund, late → ticket.
PARCELS = graph_of(("weather", "late"), ("weather", "refund"), ("late", "refund"), ("late", "ticket"))
CONFIG = {"name": "uplift", "treatment": "late", "outcome": "refund", "covariates": ["weather"]}


def difference_of(old: Graph, new: Graph) -> Difference:
    return Difference(read_graph(old), read_graph(new))


def case(seed: int) -> tuple[Graph, Graph, dict[str, Any]]:
    """A graph, the graph after some edits, and a config of the first."""
    rng = random.Random(f"change {seed}")
    question = random_pipeline(seed) if seed % 2 else random_config(seed, 5)
    config = question.config()
    return question.graph, changed_graph(rng, question.graph), config


def reason(value: Graph, config: Any) -> Any:
    """Verdict and errors (rule, columns), or the places of the faults; None where the graph is none."""
    try:
        graph = read_graph(value)
    except InvalidGraph:
        return None
    try:
        answer = review(graph, read_config(config, graph))
    except InvalidConfig as error:
        return "unreadable", {(fault.slug, fault.place) for fault in error.faults}
    errors = {(each.rule, frozenset(each.columns)) for each in answer.findings if each.severity == "error"}
    return answer.verdict, errors


def proper_subsets(items: Sequence[Any]) -> Iterator[tuple[Any, ...]]:
    return chain.from_iterable(combinations(items, size) for size in range(len(items)))


def is_like(outcome: str, found: Any, after: Any) -> bool:
    """Has a graph in between the outcome?"""
    if found is None:
        return False
    if outcome == "broken":
        return bool(found[0] != "sound")
    return bool(found[0] == "sound") if outcome == "mended" else bool(found == after)


@pytest.mark.parametrize("block", range(8))
def test_outcomes_are_those_of_reviewing_both_and_culprits_are_least(block):
    seen = Counter[str]()
    for seed in SEEDS[block::8]:
        old, new, config = case(seed)
        found = change_of(config, difference_of(old, new))
        before, after = reason(graph_with(old, new, []), config), reason(new, config)
        sound = before[0] == "sound", after[0] == "sound"
        expected = {(True, False): "broken", (False, True): "mended"}.get(
            sound, "same" if before == after else "other-reason"
        )
        assert found.outcome == expected, seed
        assert (found.before.verdict or "unreadable", found.after.verdict or "unreadable") == (
            before[0],
            after[0],
        )
        assert found.is_complete
        if expected == "same":
            assert found.culprits == ()
        else:
            assert is_like(expected, reason(graph_with(old, new, found.culprits), config), after), seed
            for chosen in proper_subsets(found.culprits):
                assert not is_like(expected, reason(graph_with(old, new, chosen), config), after), seed
        seen[expected] += 1
    assert len(seen) >= 3


def test_every_kind_of_change_turns_up_as_a_culprit():
    kinds = Counter[tuple[type, str]]()
    for seed in SEEDS[:150]:
        old, new, config = case(seed)
        kinds.update(
            (type(each), each.change) for each in change_of(config, difference_of(old, new)).culprits
        )
    assert len(kinds) == 7, kinds


def test_all_changes_together_make_the_new_graph_and_none_the_old_one():
    for seed in SEEDS[:150]:
        old, new, _config = case(seed)
        difference = difference_of(old, new)
        told = graph_with(old, new, difference.changes)
        assert node_names(told) == node_names(new)
        assert edges_of(told) == edges_of(new)
        for graph, value in ((difference.after, new), (difference.before, graph_with(old, new, []))):
            read = read_graph(value)
            assert graph.names == read.names
            assert graph.measured == read.measured
            assert graph.recorded == read.recorded
            assert dict(graph.aliases) == dict(read.aliases)
            assert (graph.sources.tolist(), graph.targets.tolist()) == (
                read.sources.tolist(),
                read.targets.tolist(),
            )
            assert graph.lower_ends.tolist() == read.lower_ends.tolist()
        added = {tuple(edge) for edge in edges_of(new) - edges_of(old)}
        assert len(difference.added_edges) == len(added)
        assert len(difference.removed_edges) == len(edges_of(old) - edges_of(new))


def test_the_same_graph_in_another_order_changes_nothing():
    for seed in SEEDS[:100]:
        old, _new, config = case(seed)
        other = shuffled(old, random.Random(seed))
        difference = difference_of(old, other)
        assert difference.changes == ()
        assert change_of(config, difference).outcome == "same"
        assert promises(old, other) == []


def changes_between(old: Graph, new: Graph) -> list[tuple[str, Any]]:
    return [
        (each.change, each.node if isinstance(each, NodeChange) else each.edge)
        for each in difference_of(old, new).changes
    ]


def test_an_arrow_turned_or_of_another_kind_is_one_change():
    chained = graph_of(("late", "refund"), ("refund", "ticket"))
    turned = graph_of(("late", "refund"), ("ticket", "refund"))
    spouses = graph_of(("late", "refund"), bidirected=[("ticket", "refund")])
    both = graph_of(("late", "refund"), ("ticket", "refund"), bidirected=[("refund", "ticket")])
    assert changes_between(chained, turned) == [("turned", ("directed", "ticket", "refund"))]
    assert changes_between(chained, spouses) == [("kind-changed", ("bidirected", "refund", "ticket"))]
    assert changes_between(spouses, turned) == [("kind-changed", ("directed", "ticket", "refund"))]
    assert changes_between(chained, both) == [
        ("turned", ("directed", "ticket", "refund")),
        ("added", ("bidirected", "refund", "ticket")),
    ]


def test_costs_notes_and_doubts_are_no_change():
    other = {
        "nodes": [{"id": name, "cost": 4} for name in node_names(PARCELS)],
        "edges": [{**edge, "note": "ours", "doubtful": True} for edge in PARCELS["edges"]],
    }
    assert difference_of(PARCELS, other).changes == ()


def test_nodes_come_and_go_with_their_edges():
    storms = graph_of(*arrows_of(PARCELS), ("storms", "late"), ("storms", "refund"), unmeasured=["storms"])
    assert changes_between(PARCELS, storms) == [("added", "storms")]
    assert changes_between(storms, PARCELS) == [("removed", "storms")]
    found = change_of(CONFIG, difference_of(PARCELS, storms))
    assert (found.outcome, found.after.verdict) == ("broken", "unanswerable")
    assert change_of(CONFIG, difference_of(storms, PARCELS)).outcome == "mended"


def test_a_config_that_names_a_removed_node_is_broken_where_it_was_sound():
    without = graph_of(("late", "refund"), ("late", "ticket"))
    difference = difference_of(PARCELS, without)
    found = change_of(CONFIG, difference)
    assert (found.outcome, found.before.verdict, found.after.verdict) == ("broken", "sound", None)
    assert [each.change for each in found.culprits] == ["removed"]
    assert isinstance(found.after.problem, InvalidConfig)
    biased = change_of({**CONFIG, "covariates": ["weather", "ticket", "refund"]}, difference)
    assert (biased.outcome, biased.before.verdict) == ("other-reason", "biased")
    nonsense = change_of({**CONFIG, "covariates": ["whether"]}, difference)
    assert (nonsense.outcome, nonsense.culprits) == ("same", ())
    assert change_of(7, difference).outcome == "same"


def test_an_alias_that_is_gone_counts():
    named = {**PARCELS, "nodes": [{"id": "weather", "columns": ["web.rain"]}, *PARCELS["nodes"][1:]]}
    found = change_of({**CONFIG, "covariates": ["web.rain"]}, difference_of(named, PARCELS))
    assert found.outcome == "broken"
    assert found.culprits == (NodeChange("changed", "weather", ("columns",)),)


def test_an_edge_removed_may_be_what_made_room():
    # refund → ticket had to go before ticket → … → refund could come.
    old = graph_of(("late", "refund"), ("refund", "ticket"), isolated=["desk"])
    new = graph_of(("late", "refund"), ("ticket", "desk"), ("desk", "refund"), ("ticket", "late"))
    config = {"treatment": "late", "outcome": "refund", "covariates": []}
    found = change_of(config, difference_of(old, new))
    assert found.outcome == "broken"
    assert "removed" in [each.change for each in found.culprits]


class Clock:
    """A second passes with each look at it."""

    looks = 0

    def __call__(self) -> float:
        self.looks += 1
        return float(self.looks)


def test_out_of_time_is_said_and_never_hides_a_break():
    storms = [("storms", "late"), ("storms", "refund"), ("ticket", "refund")]
    new = graph_of(*arrows_of(PARCELS), *storms, unmeasured=["storms"])
    over = Deadline(0)
    found = change_of(CONFIG, difference_of(PARCELS, new), Deadline.never(), over)
    assert (found.outcome, found.is_complete) == ("broken", False)
    assert len(found.culprits) == 2
    # Time enough for the review against the old graph, and none for the other.
    clock = Clock()
    judge(CONFIG, read_graph(PARCELS), Deadline(1_000, clock))
    unknown = change_of(CONFIG, difference_of(PARCELS, new), Deadline(clock.looks - 0.5, Clock()))
    assert (unknown.outcome, unknown.culprits, unknown.is_complete) == ("broken", (), False)
    assert isinstance(unknown.after.problem, OutOfTime)


@pytest.mark.parametrize("seed", range(300))
def test_least_changes_have_the_outcome_and_no_proper_subset_has(seed):
    rng = random.Random(seed)
    size = rng.randint(1, 6)
    everything = (1 << size) - 1
    having = {mask for mask in range(1, everything) if rng.random() < rng.choice([0.05, 0.3])} | {everything}
    found = least_changes(everything, having.__contains__, first=rng.randrange(everything + 1))
    assert found.is_least
    assert found.changes in having
    assert not any(mask & ~found.changes == 0 and mask != found.changes for mask in having)


def test_the_search_ends_after_as_many_sets_as_it_may_look_at():
    asked = []

    def is_everything(chosen: int) -> bool:
        asked.append(chosen)
        return chosen == (1 << 40) - 1

    found = least_changes((1 << 40) - 1, is_everything, most=30)
    assert (found.changes, found.is_least, len(asked)) == ((1 << 40) - 1, False, 30)
    big = least_changes((1 << 400) - 1, lambda chosen: chosen >> 17 & 1 == chosen >> 300 & 1 == 1)
    assert (big.changes, big.is_least) == (1 << 17 | 1 << 300, True)


def test_of_very_many_culprits_only_so_many_are_told():
    causes = [f"c{number}" for number in range(MOST_CULPRITS + 1)]
    drawn = [("late", "refund"), *((cause, "refund") for cause in causes)]
    old = graph_of(*drawn, *((cause, "late") for cause in causes))
    found = change_of({**CONFIG, "covariates": []}, difference_of(old, graph_of(*drawn)))
    assert found.outcome == "mended"
    assert (len(found.culprits), found.is_complete) == (MOST_CULPRITS, False)


def promises(old: Graph, new: Graph) -> list[tuple[str, str, tuple[str, ...]]]:
    difference = difference_of(old, new)
    found = BrokenPromises(difference.old, difference.new, difference)
    listed = list(found.statements(Deadline.never()))
    assert [place for place, _each in listed] == sorted({place for place, _each in listed})
    for start in (0, found.places // 2, found.places):
        assert list(found.statements(Deadline.never(), start)) == [
            item for item in listed if item[0] >= start
        ]
    return [(each.x, each.y, each.given) for _place, each in listed]


def brute_basis(graph: Graph) -> Iterator[tuple[str, str, tuple[str, ...]]]:
    """One statement for each pair that can be separated, from the definition of the form."""
    columns, names = measured_names(graph), node_names(graph)
    is_plain = columns == names and not bidirected_of(graph)
    for x, y in combinations(columns, 2):
        if is_adjacent(graph, x, y):
            continue
        if is_plain:
            given = {source for source, target in arrows_of(graph) if target in (x, y)}
        else:
            given = set(ancestors(graph, [x, y])) & set(columns)
        given -= {x, y}
        if separated(graph, x, y, given):
            yield x, y, tuple(name for name in names if name in given)


def is_kept(statement: tuple[str, str, tuple[str, ...]], graph: Graph) -> bool:
    x, y, given = statement
    return {x, y, *given} <= set(measured_names(graph)) and separated(graph, x, y, given)


@pytest.mark.parametrize("unmeasured", [0, 0.25])
def test_promises_that_are_not_kept_are_found_all_and_alone(unmeasured):
    lost = 0
    for seed in range(250):
        rng = random.Random(f"promises {seed}")
        old = random_graph(rng, rng.randint(1, 6), bidirected=unmeasured / 2, unmeasured=unmeasured)
        new = shuffled(changed_graph(rng, old), rng)
        for one, other in ((old, new), (new, old)):
            expected = [each for each in brute_basis(one) if not is_kept(each, other)]
            assert promises(one, other) == expected, seed
            lost += len(expected)
    assert lost > 200


def sentence(config: dict[str, Any], old: Graph, new: Graph) -> str:
    difference = difference_of(old, new)
    return change_sentence(config.get("name", ""), change_of(config, difference), difference)


def test_a_sentence_says_what_became_of_a_config_and_why():
    confounded = graph_of(*arrows_of(PARCELS), ("promo", "late"), ("promo", "refund"))
    assert sentence(CONFIG, PARCELS, confounded) == (
        "uplift: sound before, biased after: the new node promo (promo → late, promo → refund)"
        ' (missing-covariate: "promo").'
    )
    assert sentence(CONFIG, confounded, PARCELS) == (
        "uplift: biased before, sound after: the removed node promo."
    )
    assert sentence(CONFIG, PARCELS, PARCELS) == "uplift: sound before and after."
    bare = {**CONFIG, "covariates": []}
    assert sentence(bare, PARCELS, PARCELS).startswith(
        "uplift: biased before and after, for the same reason ("
    )
    turned = graph_of(("weather", "late"), ("weather", "refund"), ("refund", "late"), ("late", "ticket"))
    assert sentence(CONFIG, PARCELS, turned).startswith(
        "uplift: sound before, unanswerable after: refund → late instead of late → refund ("
    )
    gone = graph_of(("late", "refund"), ("late", "ticket"))
    assert sentence(CONFIG, PARCELS, gone) == (
        'uplift: sound before, not judged after: the removed node weather (no node is named "weather").'
    )
    hidden = {**PARCELS, "nodes": [{"id": "weather", "measured": False}, *PARCELS["nodes"][1:]]}
    assert sentence(CONFIG, PARCELS, hidden).startswith(
        "uplift: sound before, unanswerable after: weather no longer measured ("
    )
    drawn = [("weather", "ticket"), ("ticket", "refund"), ("promo", "late")]
    several = sentence(
        {**CONFIG, "covariates": []}, graph_of(("late", "refund")), graph_of(*arrows_of(PARCELS), *drawn)
    )
    assert several.startswith("uplift: sound before, biased after: the new node weather (weather → late, ")
    everywhere = graph_of(*arrows_of(PARCELS), *(("storms", name) for name in node_names(PARCELS)))
    assert "the new node storms (storms → weather, storms → late, storms → refund, 1 more edge)" in sentence(
        CONFIG, PARCELS, everywhere
    )


def test_a_sentence_cannot_be_steered_by_names():
    said = sentence({**CONFIG, "name": "up\nlift\x1b[31m"}, PARCELS, PARCELS)
    assert said == "up\\u000alift\\u001b[31m: sound before and after."


def test_the_result_is_a_value():
    one = change_of(CONFIG, difference_of(PARCELS, PARCELS))
    assert isinstance(one, ConfigChange)
    assert one == change_of(CONFIG, difference_of(PARCELS, PARCELS))
