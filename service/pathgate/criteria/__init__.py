"""Graph criteria: pure functions of a causal graph, each answer with its proof.

All that the service asks of a graph can be asked from here. The forms of statements keep their module's name before
them (``independencies.smallest``), since alone theirs would say too little.
"""

from pathgate.criteria import independencies
from pathgate.criteria.adjustment import (
    Effect,
    covariates_in,
    direct_effect,
    is_valid,
    total_effect,
    valid_set,
    valid_sets,
)
from pathgate.criteria.batch import separated_each
from pathgate.criteria.colliders import Collider, Induced, colliders, induced
from pathgate.criteria.deadline import Deadline
from pathgate.criteria.diagnosis import Forbidden, Missing, Opened, forbidden_nodes, open_paths
from pathgate.criteria.distinguishing import Distinction, are_equivalent, distinguishing
from pathgate.criteria.equivalence import Equivalence, equivalence
from pathgate.criteria.errors import CriterionError, DifferentNodes, OutOfTime, Overlapping
from pathgate.criteria.independencies import Independency
from pathgate.criteria.measuring import MeasureNext, measure_next
from pathgate.criteria.paths import OpenPath, Step, Trail, directed_path, explain_path, find_open_path
from pathgate.criteria.populations import AmongKept, InEverybody, Population
from pathgate.criteria.precision import MostPrecise, PrecisionNotes, most_precise, precision_notes
from pathgate.criteria.projection import latent_projection
from pathgate.criteria.reachability import Conditions, connected
from pathgate.criteria.selection import Kept, Label, Part, keep_rows
from pathgate.criteria.separable import Pairs, is_fully_measured
from pathgate.criteria.separation import Blocker, Separation, is_separated, separation
from pathgate.criteria.separators import Separators
from pathgate.criteria.tetrads import Tetrad, tetrads
from pathgate.criteria.usability import Unusable, needed_columns, unusable_columns
from pathgate.criteria.verdict import are_separated
from pathgate.criteria.whole import (
    is_weightable,
    least_recovering_set,
    recovering_set,
    recovering_sets,
    recovers,
    weighting,
)

__all__ = [
    "AmongKept",
    "Blocker",
    "Collider",
    "Conditions",
    "CriterionError",
    "Deadline",
    "DifferentNodes",
    "Distinction",
    "Effect",
    "Equivalence",
    "Forbidden",
    "InEverybody",
    "Independency",
    "Induced",
    "Kept",
    "Label",
    "MeasureNext",
    "Missing",
    "MostPrecise",
    "OpenPath",
    "Opened",
    "OutOfTime",
    "Overlapping",
    "Pairs",
    "Part",
    "Population",
    "PrecisionNotes",
    "Separation",
    "Separators",
    "Step",
    "Tetrad",
    "Trail",
    "Unusable",
    "are_equivalent",
    "are_separated",
    "colliders",
    "connected",
    "covariates_in",
    "direct_effect",
    "directed_path",
    "distinguishing",
    "equivalence",
    "explain_path",
    "find_open_path",
    "forbidden_nodes",
    "independencies",
    "induced",
    "is_fully_measured",
    "is_separated",
    "is_valid",
    "is_weightable",
    "keep_rows",
    "latent_projection",
    "least_recovering_set",
    "measure_next",
    "most_precise",
    "needed_columns",
    "open_paths",
    "precision_notes",
    "recovering_set",
    "recovering_sets",
    "recovers",
    "separated_each",
    "separation",
    "tetrads",
    "total_effect",
    "unusable_columns",
    "valid_set",
    "valid_sets",
    "weighting",
]
