"""The demo: a packaged sample site as a site file."""

from __future__ import annotations

import tempfile
from pathlib import Path

from audit.errors import TargetExists, WrongUse
from audit.intake.folder import read_folder
from audit.settings import UserSettings
from audit.site_file import check_new, site_file
from db.store import SiteStore
from rules.record import Site
from sample_sites.catalogue import SAMPLE_SITES, SampleSite, UnknownSampleSite, sample_site

FILE = Path("demo.ohmwalk")
"""What is written unless another file is named."""
_WHY = "demo: "
"""What the first save of a demo begins with, by which it is known again."""


def make_demo(name: str | None, target: Path | None, overwrite: bool, settings: UserSettings) -> tuple[Path, bool]:
    """
    Make a site file of a sample site; without ``target`` an earlier demo is left and used as it is.

    Parameters
    ----------
    name : str, optional
        Of the sample site; the first unless given.
    target : Path, optional
        The file; ``demo.ohmwalk`` here unless given.
    overwrite : bool
        Replace a file that is there.
    settings : UserSettings
        Who makes it, and on which laptop.

    Returns
    -------
    tuple of Path and bool
        The file, and whether it was made now.

    Raises
    ------
    WrongUse, TargetExists
        If there is no such sample site, or something else is there already.
    SiteError
        If it cannot be written, or what is there is no site file.
    """
    try:
        sample = sample_site(name or SAMPLE_SITES[0].name)
    except UnknownSampleSite as error:
        raise WrongUse(str(error)) from None
    path = target or FILE
    if path.exists() and not overwrite:
        if target is None and _is_demo(path, sample if name else None):
            return path, False
        raise TargetExists(path)
    check_new(path)
    _write(path, sample, settings)
    return path, True


def _is_demo(path: Path, sample: SampleSite | None) -> bool:
    """Whether a file is an earlier demo, of that sample site if one is named."""
    with site_file(path) as store:
        why = store.history(most=0)[0].why
    return why == f"{_WHY}{sample.name}" if sample else why.startswith(_WHY)


def _write(path: Path, sample: SampleSite, settings: UserSettings) -> None:
    # Made elsewhere first and copied as a whole: what stands at ``path`` is the old file or the new one.
    with tempfile.TemporaryDirectory() as folder:
        made = Path(folder) / FILE
        who, laptop, why = settings.who_or_login, settings.laptop, f"{_WHY}{sample.name}"
        with SiteStore.create(made, _record(sample), who, laptop, why) as store:
            store.backup(path, overwrite=True)


def _record(sample: SampleSite) -> Site:
    """The record of a sample site, wherever the package keeps its files."""
    with tempfile.TemporaryDirectory() as folder:
        for name, content in sample.files().items():
            (Path(folder) / name).write_bytes(content)
        return read_folder(Path(folder))
