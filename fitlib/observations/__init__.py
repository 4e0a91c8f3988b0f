"""CSV files to checked, frozen observations."""

from fitlib.observations.reading import check_observations, read_observations
from fitlib.observations.records import FileAccount, Observations

__all__ = ["FileAccount", "Observations", "check_observations", "read_observations"]
