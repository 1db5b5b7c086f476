"""Graph criteria: pure functions of a causal graph, each answer with its proof."""

from pathgate.criteria.adjustment import Effect, is_valid, total_effect, valid_set
from pathgate.criteria.batch import separated_each
from pathgate.criteria.colliders import Collider, Induced, colliders, induced
from pathgate.criteria.deadline import Deadline
from pathgate.criteria.diagnosis import Forbidden, Missing, Opened, forbidden_nodes, open_paths
from pathgate.criteria.distinguishing import Distinction, are_equivalent, distinguishing
from pathgate.criteria.equivalence import Equivalence, equivalence
from pathgate.criteria.errors import CriterionError, DifferentNodes, OutOfTime, Overlapping
from pathgate.criteria.measuring import MeasureNext, measure_next
from pathgate.criteria.paths import OpenPath, Step, Trail, directed_path, find_open_path
from pathgate.criteria.selection import Kept, Label, Part, keep_rows
from pathgate.criteria.separation import Blocker, Separation, is_separated, separation
from pathgate.criteria.separators import Separators
from pathgate.criteria.tetrads import Tetrad, tetrads
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
    "Blocker",
    "Collider",
    "CriterionError",
    "Deadline",
    "DifferentNodes",
    "Distinction",
    "Effect",
    "Equivalence",
    "Forbidden",
    "Induced",
    "Kept",
    "Label",
    "MeasureNext",
    "Missing",
    "OpenPath",
    "Opened",
    "OutOfTime",
    "Overlapping",
    "Part",
    "Separation",
    "Separators",
    "Step",
    "Tetrad",
    "Trail",
    "are_equivalent",
    "are_separated",
    "colliders",
    "directed_path",
    "distinguishing",
    "equivalence",
    "find_open_path",
    "forbidden_nodes",
    "induced",
    "is_separated",
    "is_valid",
    "is_weightable",
    "keep_rows",
    "least_recovering_set",
    "measure_next",
    "open_paths",
    "recovering_set",
    "recovering_sets",
    "recovers",
    "separated_each",
    "separation",
    "tetrads",
    "total_effect",
    "valid_set",
    "weighting",
]
