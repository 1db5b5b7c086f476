"""From a model config to findings: what its shape must be, what it claims, what is wrong with the claim."""

from pathgate.review.config import Config, read_config
from pathgate.review.document import review_document
from pathgate.review.errors import InvalidConfig, ReviewError
from pathgate.review.findings import Finding
from pathgate.review.remedies import Remedy
from pathgate.review.review import Review, review

__all__ = [
    "Config",
    "Finding",
    "InvalidConfig",
    "Remedy",
    "Review",
    "ReviewError",
    "read_config",
    "review",
    "review_document",
]
