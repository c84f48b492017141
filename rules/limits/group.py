"""What a profile holds: groups of numbers and words, each with where it comes from, and what it says of rules."""

from __future__ import annotations

from collections.abc import Iterable, Mapping
from dataclasses import dataclass, field

from rules.assessment import Severity


@dataclass(frozen=True, slots=True)
class Stated:
    """Where a value comes from."""

    source: str
    edition: str
    status: str
    origin: str
    """Name of the profile that stated it last."""

    @property
    def where_from(self) -> str:
        """Source, edition and status in one line, the status where the source does not say it."""
        edition = f", edition {self.edition}" if self.edition else ""
        status = "" if self.status == "verified" or self.status in self.source else f" ({self.status})"
        return f"{self.source}{edition}{status}"

    def __str__(self) -> str:
        return f"{self.where_from}; limits profile {self.origin}"


OF_SOUND_CIRCUITS = ("decision.sound_at", "decision.sound_heat_share")
"""What a circuit is called sound by: it decides no finding."""


@dataclass(frozen=True, slots=True)
class LimitGroup:
    """Some numbers of one subject, in one unit."""

    name: str
    title: str
    unit: str
    values: Mapping[str, float]
    words: Mapping[str, str] = field(default_factory=dict)
    """What is chosen by a word; no key has both a word and a number."""
    accepted: Mapping[str, tuple[str, ...]] = field(default_factory=dict)
    """The words that each key of ``words`` may hold."""
    stated: Mapping[str, Stated] = field(default_factory=dict)
    """Where the value of each key comes from."""

    def deciding(self, without: Iterable[str] = ()) -> tuple[str, ...]:
        """The keys that may decide a finding, less those that are named, ``group.key``, or all where the group is."""
        left_out = {*without, *OF_SOUND_CIRCUITS}
        keys = (*self.values, *self.words)
        return () if self.name in left_out else tuple(key for key in keys if f"{self.name}.{key}" not in left_out)

    def by_source(self, keys: Iterable[str] = ()) -> dict[Stated, list[str]]:
        """The keys of each source, of all or of those named."""
        found: dict[Stated, list[str]] = {}
        for key in keys or (*self.values, *self.words):
            found.setdefault(self.stated[key], []).append(key)
        return found


@dataclass(frozen=True, slots=True)
class RuleSetting:
    """What a profile says of one rule."""

    off: bool
    severity: Severity | None
    reason: str
    origin: str
    """Name of the profile that says it."""


@dataclass(frozen=True, slots=True)
class Limits:
    """All limits, doubts and priors in force for a site."""

    name: str
    title: str
    groups: Mapping[str, LimitGroup]
    rules: Mapping[str, RuleSetting]
    inherited: tuple[str, ...] = ()
    """The profiles that it starts from, the nearest first."""

    def __getitem__(self, key: str) -> float:
        """
        One number by group and key.

        >>> from rules.limits import of
        >>> from rules.record import Site
        >>> of(Site(name="x"))["drop.allowed_percent"]
        3.0
        """
        group, _, name = key.partition(".")
        return self.groups[group].values[name]

    def word(self, key: str) -> str:
        """
        One word by group and key.

        >>> from rules.limits import of
        >>> from rules.record import Site
        >>> of(Site(name="x")).word("capacity.table")
        'by size'
        """
        group, _, name = key.partition(".")
        return self.groups[group].words[name]

    def values(self, group: str) -> Mapping[str, float]:
        """All numbers of one group."""
        return self.groups[group].values

    def citation(self, group: str, *keys: str) -> str:
        """Where the values of a group come from that decide a finding, or those of some of its keys."""
        of = self.groups[group]
        return "; ".join(str(stated) for stated in of.by_source(keys or of.deciding()))

    @property
    def prior(self) -> Mapping[str, float]:
        """Share of circuits under each cause (with spaces), summing to one."""
        shares = self.values("prior")
        total = sum(shares.values())
        return {cause.replace("_", " "): share / total for cause, share in shares.items()}
