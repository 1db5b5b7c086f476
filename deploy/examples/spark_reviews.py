"""Reviews a table of configs inside Spark, with the package on the executors and no service at all.

    spark-submit spark_reviews.py GRAPH.yaml CONFIGS.jsonl REVIEWED

Each line of CONFIGS.jsonl is a config. Each row of REVIEWED has it with its verdict, null where it could not be judged,
and the same bytes that ``/v1/reviews`` answers: ``{"review": …}`` or ``{"problem": …}``. Exit status: 0 all are sound,
1 some verdict is another, 2 some config could not be judged, or there is none.
"""

import sys
from collections.abc import Callable, Iterator
from pathlib import Path
from typing import Any

import msgspec
import pandas as pd
from pyspark.sql import SparkSession
from pyspark.sql import functions as f

from pathgate.cli.yaml_text import read_yaml
from pathgate.graphs import read_graph
from pathgate.graphs.graph import CausalGraph
from pathgate.review.provenance import graph_digest
from pathgate.web.body import read_json
from pathgate.web.json_faults import NotJson
from pathgate.web.judging import judged
from pathgate.web.problems import Problem
from pathgate.web.settings import Settings

Batches = Iterator[pd.DataFrame]


def reviewing(graph: Any, settings: Settings) -> Callable[[Batches], Batches]:
    """What ``mapInPandas`` takes: the plain graph travels to the executors, and is indexed once for each partition."""

    def reviewed(batches: Batches) -> Batches:
        indexed = read_graph(graph)
        digest = graph_digest(indexed)
        for batch in batches:
            answers = [answer(text, indexed, digest, settings) for text in batch["config"]]
            yield pd.DataFrame(
                {
                    "config": batch["config"],
                    "verdict": [each.get("review", {}).get("verdict") for each in answers],
                    "answer": [msgspec.json.encode(each).decode() for each in answers],
                }
            )

    return reviewed


def answer(text: str, graph: CausalGraph, digest: str, settings: Settings) -> dict[str, Any]:
    """The review of a config or its problem: a row that is no JSON is one bad row, never the end of the others."""
    try:
        config = read_json(text.encode(), settings.max_depth)
    except NotJson as error:
        problem = Problem.of("not-json", str(error), line=error.line, column=error.column)
        members = problem.members("", settings.max_errors)
        del members["instance"]  # there was no request
        return {"problem": members}
    return judged(config, graph, settings, hinges=False, known_digest=digest)


def main(graph_file: str, configs_file: str, reviewed_folder: str) -> int:
    """Review, write, count."""
    settings = Settings()
    graph = read_yaml(Path(graph_file).read_text("utf-8"), settings.max_depth)
    read_graph(graph)  # a faulty graph ends it here, not on every executor
    spark = SparkSession.builder.appName("pathgate").getOrCreate()
    try:
        configs = spark.read.text(configs_file).withColumnRenamed("value", "config")
        reviewed = configs.mapInPandas(
            reviewing(graph, settings), "config string, verdict string, answer string"
        )
        reviewed.write.json(reviewed_folder)
        # Counted from what was written: to ask "reviewed" again would review everything again.
        verdict = f.col("verdict")
        counts = (
            spark.read.schema("verdict string")
            .json(reviewed_folder)
            .agg(
                f.count("*").alias("found"),
                f.count_if(verdict.isNull()).alias("not_judged"),
                f.count_if(verdict != "sound").alias("short"),
            )
            .first()
        )
    finally:
        spark.stop()
    print(f"{counts.found} found, {counts.short} short, {counts.not_judged} not judged")
    if counts.not_judged or not counts.found:
        return 2
    return 1 if counts.short else 0


if __name__ == "__main__":
    try:
        status = main(*sys.argv[1:])
    except Exception as error:  # whatever it is, nothing was judged, and 1 would say that something was
        print(f"not judged: {error}", file=sys.stderr)
        status = 2
    sys.exit(status)
