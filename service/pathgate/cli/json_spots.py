"""Where does each value of a JSON text stand?

A walk over the tokens of a text that has been read already, so that nothing in it can be wrong. O(characters).
"""

from __future__ import annotations

import json
import re
from functools import partial

from pathgate.cli.spots import Map
from pathgate.cli.spotting import Spotting

_TOKEN = re.compile(r'"[^"\\]*+(?:\\.[^"\\]*+)*+"|[{}\[\]]|[^\s"{}\[\]:,]++', re.DOTALL)


def json_map(text: str) -> Map:
    """The places of all values of a JSON text.

    >>> where = json_map('{"a": [1,\\n 22]}')
    >>> where.region(("a", "1"))
    Region(line=2, column=2, end_line=2, end_column=4)
    """
    spotting = Spotting(text)
    for match in _TOKEN.finditer(text):
        word = match[0]
        if word in "]}":
            spotting.closing()
        elif word in "[{":
            spotting.opening(match.start(), is_object=word == "{")
        else:
            spotting.scalar(match.start(), match.end(), partial(json.loads, word))
    return spotting.map()
