"""Is anything adjusted for that was recorded only after the treatment, or after the outcome?

Only the moments that the graph gives count, where both columns have one. A warning: the graph may make the column
harmless, and the verdict follows the graph. Linear in what is adjusted for.
"""

from __future__ import annotations

from collections.abc import Iterator

from pathgate.graphs.masks import members
from pathgate.review.claims import Claim
from pathgate.review.config import Config
from pathgate.review.findings import Finding
from pathgate.review.wording import listed


def timing_findings(claim: Claim, config: Config) -> Iterator[Finding]:
    """A warning for each column adjusted for that is recorded late, even where the graph makes it harmless."""
    recorded = claim.graph.recorded
    if not recorded:
        return
    for named in config.adjusted_for:
        moment = recorded.get(named.node)
        for ends, role in ((claim.treatments, "treatment"), (claim.outcomes, "outcome")):
            earlier = [
                node for node in members(ends) if moment is not None and recorded.get(node, moment) < moment
            ]
            if earlier and not claim.ends >> named.node & 1:
                name = claim.graph.name(named.node)
                message = (
                    f"{listed([name])} is recorded after the {role} {listed([claim.graph.name(earlier[0])])}: what"
                    f" the model adjusts for should be known before the {role}, unless you are sure that the"
                    f" {role} has no part in it."
                )
                yield Finding(f"covariate-recorded-after-{role}", (name,), message, named.place)
