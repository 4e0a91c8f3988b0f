"""What a plan consists of, as frozen records that can be written to a file and read back."""

from __future__ import annotations

from collections.abc import Mapping
from dataclasses import asdict, dataclass
from functools import cached_property
from typing import Any

from fitlib.errors import FitlibError

FORMAT = 1


@dataclass(frozen=True)
class DatasetPlan:
    """What will be computed for one dataset.

    Attributes
    ----------
    id : str
        Of the dataset.
    file_name : str
        Its name in file names.
    batch : str
        The batch that it belongs to.
    files : dict of str to str
        SHA-256 of the raw bytes of each data file, by its name relative to the study.
    settings : dict of str to str
        The beginning of the digest of each group of settings that the dataset uses: enough to tell what has changed.
    steps : dict of str to str
        For each step in order, its fingerprint: equal fingerprints promise equal results. The last is ``result``.
    """

    id: str
    file_name: str
    batch: str
    files: Mapping[str, str]
    settings: Mapping[str, str]
    steps: Mapping[str, str]

    @property
    def fingerprint(self) -> str:
        """Of the whole result of the dataset."""
        return self.steps["result"]


@dataclass(frozen=True)
class Batch:
    """The datasets of one job.

    Attributes
    ----------
    name : str
        ``00``, ``01`` and so on.
    members : tuple of str
        Ids, in the order of the plan.
    digest : str
        Of the members' fingerprints and of the drawing code; 64 hexadecimal digits.
    """

    name: str
    members: tuple[str, ...]
    digest: str

    @property
    def file_name(self) -> str:
        """Of the output of the job."""
        return f"{self.name}-{self.digest[:16]}.json"


@dataclass(frozen=True)
class Plan:
    """Everything that a run will compute, and what it is computed from.

    Attributes
    ----------
    study : str
        The name of the study.
    random_seed : int or None
    datasets : tuple of DatasetPlan
        Ordered as in the study record.
    batches : tuple of Batch
        Those that have members.
    digest : str
        Of data, resolved study, code and versions; the number of batches does not count.
    content_digest : str
        The same without the versions, so that a change of library versions alone can be told apart.
    code : dict of str to str
        ``numerics``, ``drawing``, ``rendering``: hashes of the program's text.
    versions : dict of str to str
        Of Python and the libraries.
    """

    study: str
    random_seed: int | None
    datasets: tuple[DatasetPlan, ...]
    batches: tuple[Batch, ...]
    digest: str
    content_digest: str
    code: Mapping[str, str]
    versions: Mapping[str, str]

    def dataset(self, dataset_id: str) -> DatasetPlan:
        """Return the plan of one dataset.

        Raises
        ------
        KeyError
            The plan has no such dataset.
        """
        return self._by_id[dataset_id]

    @cached_property
    def _by_id(self) -> dict[str, DatasetPlan]:
        return {each.id: each for each in self.datasets}

    def batch(self, name: str) -> Batch:
        """Return one batch.

        Raises
        ------
        FitlibError
            The plan has no such batch.
        """
        for each in self.batches:
            if each.name == name:
                return each
        raise FitlibError(f"batch {name} is not part of the plan {self.digest[:16]}: run again")

    def to_dict(self) -> dict[str, Any]:
        """Return the plan as JSON has it; steps are pairs, since their order must outlive sorted keys."""
        content = {"format": FORMAT, **asdict(self)}
        for each in content["datasets"]:
            each["steps"] = [[step, fingerprint] for step, fingerprint in each["steps"].items()]
        return content


def plan_from_dict(content: Mapping[str, Any]) -> Plan:
    """Return the plan that :meth:`Plan.to_dict` described.

    Parameters
    ----------
    content : dict

    Returns
    -------
    Plan

    Raises
    ------
    FitlibError
        The content is not a plan of this format.
    """
    try:
        if content["format"] != FORMAT:
            raise FitlibError(f"plan of format {content['format']!r}; this program writes format {FORMAT}: run again")
        values = {key: value for key, value in content.items() if key != "format"}
        values["datasets"] = tuple(DatasetPlan(**{**each, "steps": dict(each["steps"])}) for each in values["datasets"])
        values["batches"] = tuple(
            Batch(each["name"], tuple(each["members"]), each["digest"]) for each in values["batches"]
        )
        return Plan(**values)
    except (KeyError, TypeError, ValueError) as error:
        raise FitlibError(f"not a plan ({error}): run again") from None
