"""One function per workflow step: the only place where a study meets data."""

from fitlib.analysis.assemble import assemble
from fitlib.analysis.steps import run_step, step_names

__all__ = ["assemble", "run_step", "step_names"]
