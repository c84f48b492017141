"""
The invented buildings that come with the program, each a site folder beside this file.

``expected.toml`` in each folder states the findings that a check of it must give, exactly these, and the
faults that were put into it. It is no table of the record: intake passes over it.
"""

from __future__ import annotations

import difflib
from dataclasses import dataclass
from importlib.resources import files
from importlib.resources.abc import Traversable

EXPECTED = "expected.toml"
"""Name of the file with the stated findings in each folder."""


class UnknownSampleSite(LookupError):
    """A name that no sample site has; its text is fit for a user."""


@dataclass(frozen=True, slots=True)
class SampleSite:
    """One sample site: what it is called, where it lies and what it shows."""

    name: str
    """What people type: ``ohmwalk demo NAME``."""
    folder_name: str
    title: str
    sentence: str

    @property
    def folder(self) -> Traversable:
        """The site folder, the same from a wheel and from a checkout."""
        return files("sample_sites").joinpath(self.folder_name)

    def files(self) -> dict[str, bytes]:
        """Name and content of every file of the site folder, without the stated findings."""
        found = sorted(self.folder.iterdir(), key=lambda entry: entry.name)
        return {entry.name: entry.read_bytes() for entry in found if entry.is_file() and entry.name != EXPECTED}


SAMPLE_SITES = (
    SampleSite(
        "plant",
        "plant_48v",
        "48 V plant",
        "A 48 V exchange with battery and rectifier, feeders to four boards, shelves, a ring of lights, heaters, a 24 V converter.",
    ),
    SampleSite(
        "doors",
        "doors_24v_12v",
        "24 V control and 12 V doors",
        "A community house with 24 V control supplies and 12 V locks, strikes and readers on long thin cables.",
    ),
    SampleSite(
        "station",
        "station_110v",
        "110 V switchgear building",
        "A 110 V battery with its charger: tripping and closing coils, relays, emergency lighting, 24 V control; two visits.",
    ),
)
"""All of them; the first is the default."""


def sample_site(name: str = SAMPLE_SITES[0].name) -> SampleSite:
    """
    The sample site of a name.

    Raises
    ------
    UnknownSampleSite
        If there is none; the text names the nearest and all that there are.
    """
    names = [site.name for site in SAMPLE_SITES]
    if name not in names:
        near = difflib.get_close_matches(name, names, n=1)
        hint = f"; the nearest is {near[0]!r}" if near else ""
        raise UnknownSampleSite(f"there is no sample site {name!r}{hint}; there are: {', '.join(names)}")
    return SAMPLE_SITES[names.index(name)]
