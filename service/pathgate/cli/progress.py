"""A bar on standard error that tells how far a long run is; only where a person watches, and gone when it ends."""

from __future__ import annotations

import sys
import time
from collections.abc import Callable, Iterator
from contextlib import contextmanager
from dataclasses import dataclass, field
from typing import TYPE_CHECKING

if TYPE_CHECKING:
    from rich.progress import Progress

# Nobody needs a bar for less.
PATIENCE_SECONDS = 1.0


@contextmanager
def progress_bar(patience: float = PATIENCE_SECONDS) -> Iterator[Callable[[int, int], None]]:
    """Gives what is to be told how many are done and how many there are."""
    if not sys.stderr.isatty():
        yield lambda _done, _of: None
        return
    bar = _Bar(time.monotonic() + patience)
    try:
        yield bar.tell
    finally:
        bar.end()


@dataclass(slots=True)
class _Bar:
    begins: float
    drawn: Progress | None = field(default=None)

    def tell(self, done: int, of: int) -> None:
        """Draw it, once it is time."""
        if self.drawn is None and time.monotonic() >= self.begins:
            self.drawn = _draw()
            self.drawn.add_task("reviewing", total=of)
            self.drawn.start()
        if self.drawn is not None:
            self.drawn.update(self.drawn.task_ids[0], completed=done, total=of)

    def end(self) -> None:
        """Take it away."""
        if self.drawn is not None:
            self.drawn.stop()


def _draw() -> Progress:
    from rich.console import Console  # noqa: PLC0415 - slow to import, and short runs do without
    from rich.progress import BarColumn, MofNCompleteColumn, Progress, TextColumn, TimeRemainingColumn  # noqa: PLC0415

    columns = (TextColumn("{task.description}"), BarColumn(), MofNCompleteColumn(), TimeRemainingColumn())
    return Progress(*columns, console=Console(stderr=True), transient=True)
