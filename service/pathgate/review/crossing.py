"""Does a formula let the treatment's effect differ by another column?

Then the coefficient of the treatment alone is its effect at one value of the other column, and no average over the
rows: a warning, since the verdict is about what is held fixed. Linear in the terms.
"""

from __future__ import annotations

from collections.abc import Iterator

from pathgate.graphs.masks import mask_of
from pathgate.review.claims import Claim
from pathgate.review.config import Config
from pathgate.review.findings import Finding
from pathgate.review.wording import listed


def term_findings(claim: Claim, config: Config) -> Iterator[Finding]:
    """A warning for each term that multiplies a treatment: its coefficient is then no longer the effect."""
    graph = claim.graph
    treatments = mask_of(named.node for named in config.treated)
    alone = mask_of(term.node for term in config.terms if term.node is not None)
    for term in config.terms:
        treated = term.crossed & treatments
        if term.node is None and treated and term.crossed & ~treated:
            columns = graph.names_of(term.crossed)
            whose = listed(graph.names_of(treated))
            message = (
                f"The term {listed([term.written])} lets the effect of {whose} differ by"
                f" {listed(graph.names_of(term.crossed & ~treated))}: "
            )
            if treated & ~alone:
                message += (
                    f"without a term of {whose} alone the model takes the effect to be zero where these are zero. Add"
                    " that term, unless these are categories, and report the effect averaged over the rows."
                )
            else:
                message += (
                    "the coefficient of the treatment alone is its effect where these are zero or at their first"
                    " level. Report the effect averaged over the rows instead."
                )
            yield Finding("treatment-in-product", columns, message, term.place)
