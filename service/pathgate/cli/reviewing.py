"""What comes of reviewing every config of some files against one graph?

Configs are found, judged one after the other, and their findings weighed. A file that cannot be read is an item
too, and never the end of the others; where the graph or the baseline is of no use, every config is skipped.
"""

from __future__ import annotations

from collections import Counter
from collections.abc import Callable, Iterator, Sequence
from dataclasses import dataclass, replace
from pathlib import Path

from pathgate.cli.baseline import Baseline, read_baseline
from pathgate.cli.choices import FailOn
from pathgate.cli.files import Source, Unreadable, read_file
from pathgate.cli.finding import (
    Found,
    Json,
    faults_of,
    find_configs,
    plain_problem,
    unreadable_problem,
)
from pathgate.cli.judging import Judge, LocalJudge, Unjudgeable, read_graph
from pathgate.cli.run import Fault, Item, Run
from pathgate.cli.weighing import Scales, gone_entries, to_be_known
from pathgate.cli.wording import let_pass_text
from pathgate.web.settings import Settings

Tick = Callable[[int, int], None]
"""Told how many configs are done and how many there are."""


@dataclass(frozen=True, slots=True)
class Question:
    """What is to be reviewed, and how.

    Attributes:
        graph, configs: the files.
        dialect: the SQL of configs that name none.
        fail_on: from which severity on a finding counts.
        baseline: the file of what is known; None where nothing is.
        prune: are entries of it that no longer occur to be taken out?
        write_baseline: the file to note down as known what this run finds; the baseline itself is not asked then.
        hinges: is it to be found out what sound verdicts hinge on?
        shows_hinges: are machines to be told it too?
    """

    graph: Path
    configs: tuple[Path, ...]
    dialect: str | None = None
    fail_on: FailOn = "error"
    baseline: Path | None = None
    prune: bool = False
    write_baseline: Path | None = None
    hinges: bool = False
    shows_hinges: bool = False


Judging = Callable[[Question, Settings], Judge]
"""Who is to judge what is asked; raises ``Stopped`` where nobody can, and so does what it returns."""


class Stopped(Exception):
    """Nothing can be judged, because of what ``where`` is: ``problem`` says why."""

    def __init__(self, problem: Json, where: Found) -> None:
        super().__init__(problem["detail"])
        self.problem = problem
        self.faults = faults_of(problem, where)


def local_judge(asked: Question, settings: Settings) -> Judge:
    """Who judges in this process, against the graph asked for.

    Raises:
        Stopped: that graph cannot be used.
    """
    source = read_graph_file(asked.graph, settings)
    try:
        graph = read_graph(source, settings)
    except Unjudgeable as error:
        raise Stopped(error.problem, Found(asked.graph, source.value, source)) from None
    return LocalJudge(graph, settings, hinges=asked.hinges, dialect=asked.dialect)


def read_graph_file(file: Path, settings: Settings) -> Source:
    """What the file of the graph holds, graph or not.

    Raises:
        Stopped: it cannot be read.
    """
    try:
        return read_file(file, settings)
    except Unreadable as error:
        raise Stopped(unreadable_problem(file, error), Found(file, unreadable=error)) from None


def review_files(
    asked: Question,
    settings: Settings,
    tick: Tick = lambda _done, _of: None,
    judging: Judging = local_judge,
) -> Run:
    """Review every config that the files hold.

    Args:
        tick: told how far it is.
        judging: who judges.

    Raises:
        OSError: the baseline that is to be written or pruned cannot be.
    """
    founds = list(find_configs(asked.configs, asked.graph, settings))
    try:
        judge = judging(asked, settings)
        baseline = _baseline(asked, settings)
        answers = list(_answers(founds, judge, tick))
    except Stopped as stopped:
        return _all_skipped(asked, founds, stopped)
    if asked.write_baseline is not None:
        run = _noting_down(asked, founds, answers, Baseline(asked.write_baseline, Counter()))
    else:
        run = _weighed(asked, founds, answers, baseline)
    note = let_pass_text(run)
    return replace(run, notes=(*run.notes, note)) if note else run


def _baseline(asked: Question, settings: Settings) -> Baseline | None:
    if asked.baseline is None or asked.write_baseline is not None:
        return None
    try:
        return read_baseline(asked.baseline, settings)
    except Unreadable as error:
        problem = unreadable_problem(asked.baseline, error, "The baseline could not be used")
        raise Stopped(problem, Found(asked.baseline, unreadable=error)) from None


def _answers(founds: Sequence[Found], judge: Judge, tick: Tick) -> Iterator[Json]:
    judged = judge([found.config for found in founds if found.unreadable is None])
    for done, found in enumerate(founds):
        tick(done, len(founds))
        if found.unreadable is None:
            yield next(judged)
        else:
            yield {"problem": unreadable_problem(found.file, found.unreadable)}


def _weighed(
    asked: Question, founds: Sequence[Found], answers: Sequence[Json], baseline: Baseline | None
) -> Run:
    scales = Scales(asked.fail_on, baseline)
    items = tuple(scales.item(found, answer) for found, answer in zip(founds, answers, strict=True))
    known_by = baseline.path if baseline else None
    run = Run(items, fail_on=asked.fail_on, baseline=known_by, shows_hinges=asked.shows_hinges)
    if baseline is None:
        return run
    gone = gone_entries(baseline, scales.left, founds, items)
    if not asked.prune:
        return replace(run, gone=tuple(gone))
    if gone:
        Baseline(baseline.path, baseline.known - gone).write()
    return replace(
        run, notes=(f"Entries that no longer occur were taken out of the baseline: {sum(gone.values()):,}.",)
    )


def _noting_down(asked: Question, founds: Sequence[Found], answers: Sequence[Json], empty: Baseline) -> Run:
    """Write the baseline, and weigh by it; where something could not be judged it would say too little."""
    run = _weighed(asked, founds, answers, None)
    not_judged = run.counts.not_judged
    if not_judged or not run.items:
        note = f"The baseline was not written, since {not_judged:,} could not be judged."
        return replace(run, notes=(note,))
    full = Baseline(empty.path, to_be_known(empty, founds, run.items, asked.fail_on))
    full.write()
    note = f"The baseline was written. Findings known from now on: {full.known.total():,}."
    return replace(_weighed(asked, founds, answers, full), notes=(note,))


def _all_skipped(asked: Question, founds: Sequence[Found], stopped: Stopped) -> Run:
    items = tuple(_skipped(found, stopped.problem) for found in founds)
    return Run(items, stopped.problem, stopped.faults, asked.fail_on, asked.baseline)


def _skipped(found: Found, cause: Json) -> Item:
    """A config left alone; where it cannot be read in the first place, that is what is wrong with it."""
    if found.unreadable is not None:
        problem = unreadable_problem(found.file, found.unreadable)
        return Item(found.name, found.place(), problem=problem, faults=faults_of(problem, found))
    problem = plain_problem("Skipped", f"skipped, since nothing could be judged: {cause['detail']}")
    fault = Fault(problem["detail"], found.place())
    return Item(found.name, found.place(), problem=problem, faults=(fault,), is_skipped=True)
