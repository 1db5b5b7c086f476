"""Random configs with what pipelines do beside covariates and filters: same seed, same config.

Silent selection, computed columns and recodes (as treatments, outcomes, covariates and in filters), fixed effects,
weights, matching, effects in everybody, moments; degenerate ones among them. All of them can be read.
"""

from __future__ import annotations

import random
from dataclasses import replace
from typing import Any

from tests.review.brute_columns import Columns, columns_of
from tests.review.brute_review import Question
from tests.strategies import random_graph
from tests.values import Graph, measured_names, node_names, topological_names


def random_pipeline(seed: int, most_nodes: int = 5, *, unmeasured: float = 0.15) -> Question:
    """One config of up to ``most_nodes`` nodes and three derived columns."""
    rng = random.Random(f"pipeline {seed}")
    arrow, bidirected = rng.choice([0.25, 0.4, 0.6]), rng.choice([0, 0.1, 0.2])
    size = rng.randint(2, most_nodes)
    graph = random_graph(rng, size, arrow=arrow, bidirected=bidirected, unmeasured=unmeasured)
    graph = _with_moments(rng, _with_constants(rng, graph))
    derived = _derived(rng, graph)
    columns = columns_of(graph, derived)
    treatments, outcomes, asks = _ends(rng, columns)
    blank = Question(graph, treatments, outcomes, (), asks=asks, derived=derived)
    whole = asks == "total" and rng.random() < 0.25
    return replace(
        blank,
        **_adjusting(rng, blank),
        parts=tuple(_parts(rng, blank)),
        row_filter_fixed=rng.random() < 0.3,
        rows_exist_because=_some(rng, columns, node_names(columns.graph), most=2)
        if rng.random() < 0.3
        else (),
        missing_because=_missing(rng, columns) if rng.random() < 0.3 else {},
        population="whole" if whole else "kept",
        measured_everywhere=_some(rng, columns, sorted(blank.measured), most=3) if rng.random() < 0.4 else (),
    )


def _with_constants(rng: random.Random, graph: Graph) -> Graph:
    """Some nodes have one value within each value of some measured ones."""
    columns = measured_names(graph)
    if not columns or rng.random() < 0.5:
        return graph
    nodes = [
        {**node, "constant_within": rng.sample(columns, 1)} if rng.random() < 0.35 else node
        for node in graph["nodes"]
    ]
    return {**graph, "nodes": nodes}


def _with_moments(rng: random.Random, graph: Graph) -> Graph:
    """Half of the time, some nodes are recorded at moments that no arrow contradicts."""
    if rng.random() < 0.5:
        return graph
    moment, recorded = 0, {}
    for name in topological_names(graph) or []:
        moment += rng.randint(0, 1)
        if rng.random() < 0.8:
            recorded[name] = moment
    nodes = [
        {**node, "recorded": recorded[node["id"]]} if node["id"] in recorded else node
        for node in graph["nodes"]
    ]
    return {**graph, "nodes": nodes}


def _derived(rng: random.Random, graph: Graph) -> dict[str, dict[str, Any]]:
    names, derived = node_names(graph), dict[str, dict[str, Any]]()
    for name in [f"computed{k}" for k in range(rng.choice([0, 1, 1, 2]))]:
        made_of = rng.sample(names, min(len(names), rng.choice([1, 2, 2, 3])))
        derived[name] = {"from": made_of}
        names.append(name)
    for name in [f"recoded{k}" for k in range(rng.choice([0, 0, 1, 2]))]:
        derived[name] = {"recodes": rng.choice(names), "coarse": rng.random() < 0.5}
        names.append(name)
        if rng.random() < 0.3:
            derived[f"of {name}"] = {"from": sorted({name, rng.choice(names)})}
    # Columns are named before and after what they are computed from.
    items = list(derived.items())
    rng.shuffle(items)
    return _without_doubles(dict(items))


def _without_doubles(derived: dict[str, dict[str, Any]]) -> dict[str, dict[str, Any]]:
    """The same without columns that are computed from one column under two of its names, which is refused."""
    recoding = {name: said["recodes"] for name, said in derived.items() if "recodes" in said}

    def meant(name: str) -> str:
        while name in recoding:
            name = recoding[name]
        return name

    return {
        name: {"from": list({meant(each): each for each in said["from"]}.values())}
        if "from" in said
        else said
        for name, said in derived.items()
    }


def _ends(rng: random.Random, columns: Columns) -> tuple[tuple[str, ...], tuple[str, ...], str]:
    names = [*node_names(columns.graph), *columns.recodes]
    for _ in range(1000):
        asks = "direct" if rng.random() < 0.2 else "total"
        counts = (1, 1) if asks == "direct" else (rng.choice([1, 1, 1, 2]), rng.choice([1, 1, 1, 2]))
        if sum(counts) > len(names):
            continue
        drawn = rng.sample(names, sum(counts))
        treatments, outcomes = drawn[: counts[0]], drawn[counts[0] :]
        bases = {base for name in treatments for base in columns.bases(columns.node(name))}
        treated, results = columns.nodes(treatments), columns.nodes(outcomes)
        are_distinct = len(treated) == len(treatments) and len(results) == len(outcomes)
        if are_distinct and not (bases | treated) & results and (asks == "total" or len(bases) == 1):
            return tuple(treatments), tuple(outcomes), asks
    raise AssertionError("no two columns are apart")


def _some(rng: random.Random, columns: Columns, names: list[str], most: int) -> tuple[str, ...]:
    """Up to ``most`` of the columns, some by the names of their recodes, none twice."""
    chosen = rng.sample(names, min(len(names), rng.randint(0, most)))
    return tuple(_spelled(rng, columns, name) for name in chosen)


def _spelled(rng: random.Random, columns: Columns, name: str) -> str:
    others = [recode for recode, node in columns.recodes.items() if node == name]
    return rng.choice([name, *others])


def _adjusting(rng: random.Random, question: Question) -> dict[str, tuple[str, ...]]:
    columns = question.columns
    free = [name for name in node_names(columns.graph) if name not in question.ends]
    usable = [name for name in free if name in question.measured]
    pool = usable if rng.random() < 0.85 else free
    covariates = list(_some(rng, columns, pool, most=3))
    if rng.random() < 0.05:
        covariates.append(rng.choice(sorted(question.ends)))
    if covariates and columns.recodes and rng.random() < 0.3:
        covariates += [name for name in columns.recodes if name not in covariates][:1]
    rest = [name for name in pool if name not in columns.nodes(covariates) or rng.random() < 0.1]
    said = {"covariates": tuple(covariates)}
    for member, odds in (("fixed_effects", 0.4), ("weighted_by", 0.2), ("matched_on", 0.15)):
        said[member] = _some(rng, columns, rest, most=2) if rng.random() < odds else ()
        rest = [name for name in rest if name not in columns.nodes(said[member]) or rng.random() < 0.1]
    return said


def _parts(rng: random.Random, question: Question) -> list[dict[str, Any]]:
    columns = question.columns
    parts = []
    for _ in range(rng.choice([0, 0, 1, 1, 2])):
        pool = node_names(columns.graph) if rng.random() < 0.1 else sorted(question.measured)
        chosen = rng.sample(pool, min(len(pool), rng.choice([1, 1, 2])))
        if chosen:
            fixed = len(chosen) == 1 and rng.random() < 0.4
            parts.append({"columns": [_spelled(rng, columns, name) for name in chosen], "fixed": fixed})
    return parts


def _missing(rng: random.Random, columns: Columns) -> dict[str, tuple[str, ...]]:
    names = node_names(columns.graph)
    about = rng.sample(names, min(len(names), rng.choice([1, 1, 2])))
    return {_spelled(rng, columns, name): _some(rng, columns, names, most=2) for name in about}
