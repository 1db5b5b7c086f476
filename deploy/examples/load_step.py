"""A step of a load: a metric's numbers go into the warehouse only where the service says that they mean it.

    python load_step.py URL GRAPH CONFIG NUMBERS.csv DATABASE

Exit status as of ``pathgate review``: 0 loaded, 1 the config falls short, 2 anything else, a config that could not be
judged above all. The load comes after the gate, so that whatever goes wrong there stops it.
"""

import csv
import sqlite3
import sys
from contextlib import closing
from pathlib import Path

from ruamel.yaml import YAML

from pathgate.client import Client, FallsShort


def main(url: str, graph: str, config: str, numbers: str, database: str) -> None:
    """Gate, then load: the gate returns only where the config passes, and raises whatever else happens."""
    yaml = YAML(typ="safe", pure=True)
    # Five retries within thirty seconds in all, and only of what the service says may be tried again.
    client = Client(url, timeout=30, retries=5)
    client.gate(yaml.load(Path(graph)), yaml.load(Path(config)))
    load(Path(numbers), Path(database))


def load(numbers: Path, database: Path) -> None:
    """Append the rows in one transaction: all of them or none."""
    with numbers.open(newline="", encoding="utf-8") as file:
        rows = [(row["metric"], row["day"], float(row["value"])) for row in csv.DictReader(file)]
    with closing(sqlite3.connect(database)) as warehouse, warehouse:
        warehouse.execute("CREATE TABLE IF NOT EXISTS published (metric TEXT, day TEXT, value REAL)")
        warehouse.executemany("INSERT INTO published VALUES (?, ?, ?)", rows)


if __name__ == "__main__":
    try:
        main(*sys.argv[1:])
    except FallsShort as short:
        print(f"not loaded, the config falls short: {short}", file=sys.stderr)
        sys.exit(1)
    except Exception as error:  # whatever it is: Python itself would end with 1, which means "judged"
        print(f"not loaded: {error}", file=sys.stderr)
        sys.exit(2)
