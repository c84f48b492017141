"""
Whether a record holds together: everything in it that does not, in one go.

Intake refuses a folder with what this finds, and an assessment shows the same of a site file that came
from elsewhere. What is asked of a cell by itself, of tags, feeds, runs, readings, meters and settings stands
in ``rules.problems``, one subject a file. Whether there is a limits profile of the site's name is asked where
profiles are read (``rules.limits``).
"""

from __future__ import annotations

from itertools import chain

from rules.index import Index
from rules.problems.cells import cell_problems
from rules.problems.feeders import feeder_problems
from rules.problems.meters import meter_problems
from rules.problems.problem import Problem
from rules.problems.readings import reading_problems
from rules.problems.runs import run_problems
from rules.problems.settings import setting_problems
from rules.problems.tags import tag_problems
from rules.record import TABLES, Site, columns
from rules.text import Suggestions

__all__ = ["Problem", "problems"]


def problems(site: Site) -> tuple[Problem, ...]:
    """
    Everything in a record that does not hold together.

    Parameters
    ----------
    site : Site
        Any record, however broken; time grows in proportion to its rows.

    Returns
    -------
    tuple of Problem
        The settings' first, then by table, row and column; empty where the record holds together.

    Examples
    --------
    >>> from rules.record import Circuit, Feed
    >>> site = Site(name="hut", circuits=(Circuit(id="c", tag="C1", fed_from=Feed("", "?B1")),))
    >>> [problem.text for problem in problems(site)]
    ["'B1' names no board or source; accepted: the tag of a board or source that is there"]
    """
    index = Index(site)
    suggestions = Suggestions()
    found = dict.fromkeys(
        chain(
            setting_problems(site),
            cell_problems(site),
            tag_problems(index),
            feeder_problems(index, suggestions),
            run_problems(index, suggestions),
            reading_problems(index, suggestions),
            meter_problems(index, suggestions),
        )
    )
    return tuple(_in_order(found, site)) if found else ()


def _in_order(found: dict[Problem, None], site: Site) -> list[Problem]:
    tables = {"site": 0} | {table: n for n, table in enumerate(TABLES, 1)}
    rows = {(table, row.id): n for table in TABLES for n, row in enumerate(site.table(table))}
    places = {(table, column.name): n for table in TABLES for n, (_, column) in enumerate(columns(table))}
    return sorted(
        found,
        key=lambda p: (tables[p.table], rows.get((p.table, p.row), 0), places.get((p.table, p.column), 0)),
    )
