"""A site prepared for judging, and what was read on a circuit's visit."""

from __future__ import annotations

from collections.abc import Mapping, Sequence
from dataclasses import dataclass, field

from rules.consistency import Problem
from rules.diagnosis.common_error import Taught
from rules.diagnosis.diagnose import Diagnosis
from rules.index import Index
from rules.limits import Limits
from rules.network import Network
from rules.record import Figure, Reading, Site
from rules.rounds import Round, Tree
from rules.runs import Figures


@dataclass(frozen=True, slots=True)
class Context:
    """A site prepared for judging: solved, indexed, its limits resolved."""

    recorded: Site
    """As it stands in the record, whatever is wrong with it."""
    site: Site
    """What of it holds together, by which all is judged; mostly all of it."""
    limits: Limits
    index: Index
    figures: Figures
    """Of every run, by id, and of the returns that runs share."""
    network: Network
    visit_ranks: Mapping[str, tuple[float, str, int]]
    problems: tuple[Problem, ...]
    left_out: frozenset[str] = frozenset()
    """Ids of recorded readings that are no part of ``site``."""
    measured: Mapping[str, Measured] = field(default_factory=dict)
    """By circuit id: what was read on the visit that it is judged on."""
    diagnoses: Mapping[str, Diagnosis] = field(default_factory=dict)
    """By circuit id, of those whose readings say something."""
    taught: Taught = field(default_factory=Taught)
    """What meters and habits that circuits share have taught."""
    common: Mapping[str, Figure] = field(default_factory=dict)
    """By circuit id: error that a circuit shares with others, relative to its computed drops; none where none was found."""
    unused: Mapping[str, tuple[str, ...]] = field(default_factory=dict)
    """By circuit id: readings that nothing makes use of."""
    joints: Mapping[tuple[str, ...], Sequence[SimilarJoint]] = field(default_factory=dict)
    """Joints that were read across themselves, by what makes them similar."""


@dataclass(frozen=True, slots=True)
class SimilarJoint:
    """A termination or pole of some circuit, to compare others with."""

    circuit: str
    """Its tag."""
    place: str
    ohm: Figure


@dataclass(frozen=True, slots=True)
class Measured:
    """The readings of one visit on one circuit."""

    visit: str
    """Empty where nothing was read."""
    readings: tuple[Reading, ...]
    rounds: tuple[Round, ...]
    tree: Tree
