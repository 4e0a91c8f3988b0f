"""Where Snakemake finds its settings: a profile of this workflow by name, or one of the user's own."""

from __future__ import annotations

import os
from pathlib import Path

from fitlib.errors import InputError, Problem
from fitlib.plan import workflow_folder

DEFAULT = "default"
NO_PROFILE = "none"  # Snakemake's word for it


def profile_options(profile: str | None) -> list[str]:
    """Return the words that name a profile to Snakemake.

    Parameters
    ----------
    profile : str or None
        A profile of this workflow by name, a folder or file, or a name that Snakemake looks up in the folders for its
        settings.

    Returns
    -------
    list of str

    Raises
    ------
    InputError
        There is no such profile.
    """
    own = workflow_folder() / "profiles"
    if profile is None or profile in _names(own):
        return ["--workflow-profile", str(own / (profile or DEFAULT))]
    return ["--workflow-profile", str(own / DEFAULT), "--profile", _found(profile, own)]


def _names(own: Path) -> list[str]:
    return sorted(place.name for place in own.iterdir() if place.is_dir())


def _found(profile: str, own: Path) -> str:
    """A place is named from where the user stands, not from where Snakemake runs."""
    if profile == NO_PROFILE:
        return profile
    from snakemake.cli import get_profile_dir

    place = os.path.abspath(profile) if profile and os.path.exists(profile) else profile
    if not place or get_profile_dir(place) is None:
        message = (
            f"no such profile: it is neither one of this workflow ({', '.join(_names(own))}) nor a file, a folder with "
            "a profile.yaml, or the name of one among Snakemake's settings"
        )
        raise InputError([Problem(f"--profile {profile}".rstrip(), message)])
    return place
