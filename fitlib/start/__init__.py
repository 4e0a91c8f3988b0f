"""A commented study from a data file."""

from fitlib.start.proposal import propose_study, write_new

__all__ = ["propose_study", "write_new"]
