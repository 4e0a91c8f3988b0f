"""Immutable revisions of results: publish, read, verify, compare."""

from fitlib.revision.compare import compare_revisions
from fitlib.revision.comparison import Comparison
from fitlib.revision.publishing import Published, next_revision, publish
from fitlib.revision.read import Revision, latest_revision, read_revision
from fitlib.revision.same import same_results
from fitlib.revision.verify import Difference, verify_revision

__all__ = [
    "Comparison",
    "Difference",
    "Published",
    "Revision",
    "compare_revisions",
    "latest_revision",
    "next_revision",
    "publish",
    "read_revision",
    "same_results",
    "verify_revision",
]
