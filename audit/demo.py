"""Copying a packaged sample site."""

from __future__ import annotations

import shutil
import tempfile
from pathlib import Path

from audit.errors import TargetExists, WrongUse
from sample_sites.catalogue import SAMPLE_SITES, UnknownSampleSite, sample_site


def copy_sample(name: str | None, target: Path | None, overwrite: bool) -> tuple[Path, bool]:
    """
    Copy a sample site to a folder; without ``target`` an earlier copy is left and used as it is.

    Returns
    -------
    tuple of Path and bool
        The folder, and whether it was written now.
    """
    try:
        sample = sample_site(name or SAMPLE_SITES[0].name)
    except UnknownSampleSite as error:
        raise WrongUse(str(error)) from None
    folder = target or Path(sample.folder_name)
    if folder.exists() and not overwrite:
        if target is None and (folder / "site.toml").is_file():
            return folder, False
        raise TargetExists(folder)
    if folder.exists() and not (folder / "site.toml").is_file():
        raise WrongUse(f"{folder} is no site folder; it is left as it is")
    folder.parent.mkdir(parents=True, exist_ok=True)
    # written beside first, so that an interrupted copy leaves no half of a site
    with tempfile.TemporaryDirectory(dir=folder.parent, prefix=".ohmwalk-") as beside:
        draft = Path(beside) / "site"
        draft.mkdir()
        for file_name, content in sample.files().items():
            (draft / file_name).write_bytes(content)
        if folder.exists():
            shutil.move(folder, Path(beside) / "before")
        shutil.move(draft, folder)
    return folder, True
