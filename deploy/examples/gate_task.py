"""A task for an orchestrator: tries again where a config could not be judged, and never where it was judged and short.

    python gate_task.py pathgate review GRAPH CONFIG...

A config that falls short does so at every try, so that trying again only delays the news; what could not be judged
(exit status 2: the service is away, a file not there yet) may be judged a little later.

To wire it in: call ``gate`` from the task and leave the orchestrator's own retries at 0. Or let the orchestrator try
again: call ``gate(command, tries=1)``, turn ``FallsShort`` into its exception for "failed, do not retry", and leave
``NotJudged`` as it is. Either way let the tasks that publish depend on this one succeeding, not on its having ended.
"""

import subprocess
import sys
import time
from collections.abc import Callable, Sequence

PASSED, SHORT, NOT_JUDGED = 0, 1, 2


class FallsShort(Exception):
    """Some config was judged and falls short. Never to be tried again."""


class NotJudged(Exception):
    """Some config could not be judged, at no try."""


def gate(
    command: Sequence[str],
    *,
    tries: int = 3,
    pause: Callable[[float], object] = time.sleep,
    seconds_per_try: float = 300,
) -> None:
    """Return only where the command passes; pauses of 5, 10, 20 … seconds stand between tries."""
    for attempt in range(tries):
        if attempt:
            pause(5 * 2 ** (attempt - 1))
        status, said = run_once(command, seconds_per_try)
        if status == PASSED:
            return
        if status == SHORT:
            raise FallsShort(said)
        if status != NOT_JUDGED:
            raise NotJudged(f"ended with {status}, which is none of its statuses: {said}")
    raise NotJudged(f"not judged in {tries} tries, of which the last said: {said}")


def run_once(command: Sequence[str], seconds: float) -> tuple[int, str]:
    """The exit status and all that was said; a command that does not end in time judged nothing."""
    try:
        done = subprocess.run(command, capture_output=True, text=True, timeout=seconds, check=False)
    except subprocess.TimeoutExpired:
        return NOT_JUDGED, f"no end within {seconds:g} seconds"
    return done.returncode, (done.stdout + done.stderr).strip()


if __name__ == "__main__":
    try:
        gate(sys.argv[1:])
    except FallsShort as short:
        print(short, file=sys.stderr)
        sys.exit(SHORT)
    except (NotJudged, OSError) as error:
        print(error, file=sys.stderr)
        sys.exit(NOT_JUDGED)
