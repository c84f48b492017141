"""Settings of a site and its sources that do not hold together: name, voltage, temperature, profile, prior."""

from __future__ import annotations

import re
from collections.abc import Iterator
from functools import partial

from rules.columns import Column
from rules.problems.cells import number_complaint, text_complaint
from rules.problems.problem import Problem
from rules.record import Site
from rules.text import either, nearest, quoted

CAUSES = (
    "as recorded",
    "bad connection",
    "smaller conductor",
    "other metal",
    "longer route",
    "series semiconductor",
    "reading or record doubtful",
)
"""What a circuit's readings may be due to: the keys that ``[prior]`` may have."""

SETTINGS: dict[str, tuple[str, Column]] = {
    "name": ("name", Column("name", header=True, filled=True)),
    "address": ("address", Column("address")),
    "limits": ("limits", Column("limits", filled=True)),
    "nominal": ("nominal_voltage_v", Column("nominal", "number", unit="V", least=1e-3, most=10_000)),
    "ambient": ("ambient_temperature_c", Column("ambient", "number", unit="degC", least=-90, most=400)),
    "surveyed_by": ("surveyed_by", Column("surveyed_by")),
    "extent": ("extent", Column("extent")),
    "limitations": ("limitations", Column("limitations")),
    "notes": ("notes", Column("notes", "notes")),
}
"""Keys of ``site.toml`` beside ``[prior]``: field of the site, and what is accepted."""

SHARE = Column("prior", "number", least=0, most=1e9)
"""A share of ``[prior]``; shares are normalised where they are used."""

_PROFILE_FILE = re.compile(r"\w[\w .-]*\.toml")
"""No separators and no leading dot: ``unload`` writes a file of that name."""

_problem = partial(Problem, "site", "")


def setting_problems(site: Site) -> Iterator[Problem]:
    """Everything that is wrong with the settings of a site."""
    for key, (field, column) in SETTINGS.items():
        value = getattr(site, field)
        if value is None or value == "":
            if column.filled:
                yield _problem(key, "is empty", "a text")
            continue
        number = isinstance(value, float | int)
        complaint = number_complaint(value, column) if number else text_complaint(value, lines=column.kind == "notes")
        if complaint is not None:
            yield _problem(key, *complaint)
    keys = {field: key for key, (field, _) in SETTINGS.items()}
    for field, text in site.typed:
        if (complaint := text_complaint(text)) is not None:
            yield _problem(keys.get(field, field), *complaint)
    if site.own_limits is not None and not is_profile_file(site.limits):
        yield _problem("limits", f"{quoted(site.limits)} cannot be the file of the site's own profile", "NAME.toml")
    yield from _prior_problems(site)
    yield from _source_problems(site)


def is_profile_file(name: str) -> bool:
    """
    Whether a site's own profile may have this name: that of a plain file beside ``site.toml``.

    Examples
    --------
    >>> is_profile_file("ours.toml"), is_profile_file("../ours.toml"), is_profile_file("site.toml")
    (True, False, False)
    """
    return _PROFILE_FILE.fullmatch(name) is not None and name.casefold() != "site.toml"


def _prior_problems(site: Site) -> Iterator[Problem]:
    if not site.prior:
        return
    seen: set[str] = set()
    for cause, share in site.prior:
        if cause not in CAUSES:
            near = nearest(cause[:100], CAUSES)
            hint = "" if near is None else f", did you mean {near.replace(' ', '_')}?"
            causes = either([known.replace(" ", "_") for known in CAUSES])
            yield _problem("prior", f"{quoted(cause.replace(' ', '_'))} is no cause", causes + hint)
        elif cause in seen:
            yield _problem("prior", f"{quoted(cause.replace(' ', '_'))} stands there twice", "each cause once")
        seen.add(cause)
        if (complaint := number_complaint(share, SHARE)) is not None:
            what, accepted = complaint
            yield _problem("prior", f"the share of {cause.replace(' ', '_')}: {what}", accepted)
    if CAUSES[0] not in seen:
        yield _problem("prior", "does not name as_recorded", "the share of as_recorded beside the others")
    if all(share == 0 for _, share in site.prior):
        yield _problem("prior", "gives every cause the share 0", "at least one share above 0")
    elif any(cause == CAUSES[0] and share == 0 for cause, share in site.prior):
        yield _problem("prior", "gives as_recorded the share 0", "a share of as_recorded above 0")


def _source_problems(site: Site) -> Iterator[Problem]:
    for source in site.sources:
        low, high = source.lowest_voltage_v, source.highest_voltage_v
        if low is not None and high is not None and low > high:
            what = f"{low:.12g} V is above the highest, {high:.12g} V"
            yield Problem("sources", source.id, "lowest", what, "a voltage not above the highest")
