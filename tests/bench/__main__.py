"""Runs the benchmarks and prints their table; names on the command line choose some of them.

python -m tests.bench [NAME …]
"""

from __future__ import annotations

import os
import platform
import sys
from collections.abc import Callable, Iterator

from tests.bench.adjusting import checking_a_set, first_hundred_sets, first_set_of_very_many
from tests.bench.changing import change_of_graph
from tests.bench.harness import Figure, table
from tests.bench.in_process import many_statements, single_verdicts, whole_large_request
from tests.bench.over_http import (
    batch_of_reviews,
    memory_after_a_large_request,
    memory_of_a_long_stream,
    small_review,
)
from tests.bench.promising import first_page_of_a_large_graph, smallest_for_all_pairs
from tests.bench.reviewing import one_review

BENCHES: dict[str, Callable[[], Iterator[Figure]]] = {
    "large-request": whole_large_request,
    "small-review": small_review,
    "single-verdicts": single_verdicts,
    "many-statements": many_statements,
    "hundred-sets": first_hundred_sets,
    "first-set": first_set_of_very_many,
    "check-a-set": checking_a_set,
    "all-pairs": smallest_for_all_pairs,
    "first-page": first_page_of_a_large_graph,
    "one-review": one_review,
    "change": change_of_graph,
    "batch": batch_of_reviews,
    "stream": memory_of_a_long_stream,
    "memory": memory_after_a_large_request,
}


def main(wanted: list[str]) -> int:
    """The exit status tells whether the names were right; figures never fail."""
    unknown = [name for name in wanted if name not in BENCHES]
    if unknown:
        print(f"no bench is called {', '.join(unknown)}; there are {', '.join(BENCHES)}", file=sys.stderr)
        return 2
    print(f"Python {platform.python_version()}, {platform.machine()}, {os.cpu_count()} cores")
    figures = []
    for name in wanted or BENCHES:
        for figure in BENCHES[name]():
            print(f"  {name}: {figure.what} … {figure.seen:.3g}", file=sys.stderr, flush=True)
            figures.append(figure)
    print(table(figures))
    return 0


if __name__ == "__main__":
    sys.exit(main(sys.argv[1:]))
