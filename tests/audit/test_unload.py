"""A site that was written as a folder and read again is the same site."""

from __future__ import annotations

import errno
import os
from datetime import datetime
from pathlib import Path
from tempfile import TemporaryDirectory
from typing import Any

import pytest
from hypothesis import HealthCheck, assume, given, settings
from hypothesis import strategies as st

from audit.errors import AuditError, TargetExists, WriteFailed
from audit.intake.folder import read_folder, site_of
from audit.unload import folder_files, unload
from rules.columns import NEAREST_ZERO, Column, within
from rules.consistency import problems
from rules.problems.cells import FIRST_YEAR, LAST_YEAR
from rules.problems.runs import is_reserved
from rules.problems.settings import CAUSES, SETTINGS, SHARE
from rules.record import TABLES, UNIT_OF_QUANTITY, Feed, Site, columns
from rules.text import forbidden_character
from rules.units import parse

NASTY = (
    "a,b", 'say "on"', "'", "=1+1", "+1", "-1", "@SUM(A1)", "<b>&amp;</b>", "[red]x[/]", "{{ x }}", "#let x",
    "مرتفع", "מרתף", "🔋👩‍🔧", "Ω µ ° ²", "\u2028", "B1:07", "A + B", "x\u00a0y", "NULL", "0", "1e5", "?", "\ufeffx", "\\n", "$",
)  # fmt: skip
FOREIGN = {"m": "ft", "V": "mV", "A": "mA", "ohm": "mohm", "W": "kW", "s": "ms", "degC": "°F"}
"""Another unit for each unit of the record."""


def is_plain_text(text: str) -> bool:
    return text == text.strip() and forbidden_character(text) is None


words = st.one_of(
    st.sampled_from([text for text in NASTY if is_plain_text(text)]),
    st.text(st.characters(exclude_categories=("Cc", "Cs")), min_size=1, max_size=8).filter(is_plain_text),
).filter(bool)
notes = st.one_of(
    st.sampled_from(NASTY),
    st.text(st.one_of(st.sampled_from("\n\t \"',"), st.characters(exclude_categories=("Cc", "Cs")))),
).filter(lambda text: forbidden_character(text, lines=True) is None)
DAYS = datetime(FIRST_YEAR, 1, 1), datetime(LAST_YEAR, 12, 31)
points = words.filter(lambda text: not is_reserved(text))


@st.composite
def numbers(draw: st.DrawFn, column: Column, unit: str) -> tuple[float | None, str | None]:
    """A number that the column accepts, and what it was typed as."""
    if unit in FOREIGN and draw(st.booleans()):
        text = f"{draw(st.integers(33, 300))} {FOREIGN[unit]}"
        return parse(text, unit), text
    return draw(st.one_of(st.none(), plain_numbers(column, unit))), None


def plain_numbers(column: Column, unit: str) -> st.SearchStrategy[float]:
    """Numbers within the bounds by which intake judges the column."""
    bounds = within(column, unit)
    low = bounds.least if bounds.above is None else bounds.above
    found = st.floats(low, bounds.most, exclude_min=bounds.above is not None, allow_nan=False, allow_infinity=False)
    return found.map(lambda value: value if abs(value) >= NEAREST_ZERO else bounds.least or 0.0)


def settings_of(key: str) -> st.SearchStrategy[float]:
    """Numbers that a setting of the site accepts."""
    _, column = SETTINGS[key]
    return plain_numbers(column, column.unit)


shares = plain_numbers(SHARE, "").filter(bool)


@st.composite
def cells(draw: st.DrawFn, /, table: str, **fixed: Any) -> dict[str, Any]:
    """Fields of a row: those not fixed hold anything that their column accepts, or nothing."""
    unit = UNIT_OF_QUANTITY.get(fixed.get("quantity", ""), "")
    values: dict[str, Any] = dict(fixed)
    typed: list[tuple[str, str]] = []
    for name, column in columns(table):
        if name in fixed or (column.kind != "notes" and draw(st.integers(0, 3)) == 0 and not column.filled):
            continue
        if column.kind == "number":
            value, text = draw(numbers(column, unit if column.unit == "*" else column.unit))
            values[name] = value
            typed += [] if text is None else [(name, text)]
        elif column.kind == "whole":
            values[name] = draw(st.integers(int(column.least or 0), int(column.most or 0)))
        else:
            values[name] = draw(
                {
                    "choice": st.sampled_from(column.choices or ("",)),
                    "notes": notes,
                    "size": st.sampled_from(("2.5 mm2", "12 AWG", "4/0 AWG", "250 kcmil", "")),
                    "date": st.dates(DAYS[0].date(), DAYS[1].date()).map(str),
                    "time": st.datetimes(*DAYS).map(lambda when: when.isoformat()),
                    "return": st.sampled_from(("own", "structure", "")),
                }.get(column.kind, words)
            )
    return values | {"typed": tuple(sorted(typed))}


@st.composite
def sites(draw: st.DrawFn) -> Site:
    """Sites that hold together, with every table and every kind of reference."""
    rows: dict[str, list[Any]] = {table: [] for table in TABLES}

    def add(table: str, **fixed: Any) -> str:
        id_ = f"{table}-{len(rows[table])}"
        rows[table].append(TABLES[table](id=id_, **draw(cells(table, **fixed))))
        return id_

    tags = iter(draw(st.lists(words, min_size=12, max_size=12, unique=True)))
    no_limit = {"lowest_voltage_v": None}
    battery, rectifier = (add("sources", tag=next(tags), kind="battery", fed_from=None, **no_limit) for _ in range(2))
    parallel = (Feed("sources", battery), Feed("sources", rectifier))
    main = add("boards", tag=next(tags), fed_by=draw(st.sampled_from([parallel, parallel[:1]])))
    feeder = add("circuits", tag=next(tags), fed_from=Feed("boards", main))
    ends = draw(st.lists(points, min_size=3, max_size=3, unique=True))
    order = draw(st.permutations([(1, "way", ends[0]), (2, ends[0], ends[1]), (7, ends[0], ends[2])]))
    for number, start, end in order:
        add("runs", circuit_id=feeder, number=number, from_point=start, to_point=end, return_size="")
    board = add("boards", tag=next(tags), fed_by=(Feed("circuits", feeder, draw(st.sampled_from(["", *ends]))),))
    circuit = add("circuits", tag=next(tags), fed_from=Feed("boards", board))
    add("runs", circuit_id=circuit, number=1, from_point="way", to_point="", to_board_id=main, return_size="")
    converter = Feed("circuits", feeder, ends[1])
    source = add("sources", tag=next(tags), kind="converter", fed_from=converter, **no_limit)
    add("circuits", tag=next(tags), fed_from=Feed("sources", source))
    add("loads", circuit_id=feeder, point=ends[1], tag=next(tags), **no_limit)
    meter = next(tags)
    add("instruments", tag=meter, quantity="voltage", full_scale=None)
    add("visits", tag=next(tags))
    reading = {"leg": "", "to": "", "full_scale": None, "replaces_id": "", "quantity": "voltage"}
    value = draw(plain_numbers(dict(columns("readings"))["value"], "V"))
    on_circuit = reading | {"circuit_id": feeder, "board": None, "at": ends[0], "value": value, "instrument": meter}
    first = add("readings", **on_circuit, tag=next(tags))
    add("readings", **on_circuit | {"replaces_id": first, "at": "bus"}, tag="")
    on_busbar = reading | {"circuit_id": "", "board": Feed("boards", main), "at": "bus", "value": value}
    add("readings", **on_busbar | {"instrument": ""}, tag="")
    add("decisions")
    add("acknowledged")

    profile = draw(st.sampled_from([None, "", 'title = "Ω"\r\n# two\n']))
    typed = draw(st.sampled_from([(), (("nominal_voltage_v", "48 V"),)]))
    tables: dict[str, Any] = {table: tuple(table_rows) for table, table_rows in rows.items()}
    return Site(
        name=draw(words),
        address=draw(st.one_of(st.just(""), words)),
        notes=draw(notes),
        limits="general" if profile is None else "our profile.toml",
        own_limits=profile,
        nominal_voltage_v=48.0 if typed else draw(st.one_of(st.none(), settings_of("nominal"))),
        ambient_temperature_c=draw(st.one_of(st.none(), settings_of("ambient"))),
        prior=tuple((cause, draw(shares)) for cause in draw(st.sampled_from([(), CAUSES[:2], CAUSES]))),
        typed=typed,
        **tables,
    )


@given(sites())
@settings(max_examples=60, deadline=None, suppress_health_check=[HealthCheck.too_slow, HealthCheck.filter_too_much])
def test_a_site_survives_the_way_through_a_folder(site: Site) -> None:
    found = problems(site)
    # Among such tags, one can look like two others with what stands between them: `A + B`, or `C:p`.
    assume(not any("can be read two ways" in problem.what for problem in found))
    assert found == ()
    with TemporaryDirectory() as above:
        folder = Path(above) / "out"
        unload(site, folder)
        assert read_folder(folder) == site


@pytest.fixture
def site() -> Site:
    return site_of(
        {
            "sources": [{"source": "BATT", "kind": "battery", "nominal": "48"}],
            "circuits": [{"circuit": "C1", "fed_from": "BATT"}],
            "runs": [{"circuit": "C1", "run": "1", "from": "way", "to": "p1", "length": "45 ft", "size": "2,5 mm²"}],
        },
        {"name": "Hut", "nominal": "48 V", "notes": "a\nb", "prior": {"as_recorded": 0.75}},
    )


def test_the_files_hold_required_columns_and_what_is_there(site: Site) -> None:
    assert folder_files(site) == {
        "site.toml": 'name = "Hut"\nlimits = "general"\nnominal = "48 V"\nnotes = "a\\nb"\n\n[prior]\nas_recorded = 0.75\n',
        "sources.csv": "source,kind,nominal [V]\nBATT,battery,48\n",
        "circuits.csv": "circuit,fed_from\nC1,BATT\n",
        "runs.csv": "circuit,run,from,to,length [m],size\nC1,1,way,p1,45 ft,2.5 mm2\n",
    }


def names(folder: Path) -> list[str]:
    return sorted(str(path.relative_to(folder)) for path in folder.rglob("*"))


def test_a_folder_that_is_there_stays_as_it_is(site: Site, tmp_path: Path) -> None:
    folder = tmp_path / "hut"
    folder.mkdir()
    (folder / "site.toml").write_text("mine")
    with pytest.raises(TargetExists, match="exists already; accepted: another name, or --overwrite"):
        unload(site, folder)
    assert names(tmp_path) == ["hut", "hut/site.toml"]
    assert (folder / "site.toml").read_text() == "mine"


def test_overwriting_leaves_nothing_of_the_old_site(site: Site, tmp_path: Path) -> None:
    folder = tmp_path / "hut"
    unload(site, folder)
    (folder / "loads.csv").write_text("old")
    (folder / "ours.toml").write_text("old")
    unload(site, folder, overwrite=True)
    assert read_folder(folder) == site
    assert names(tmp_path) == ["hut", *(f"hut/{name}" for name in sorted(folder_files(site)))]


@pytest.mark.parametrize("name", ["photo.jpg", "survey.xlsx", "loads.csv/x"])
def test_overwriting_spares_what_is_no_part_of_a_site_folder(name: str, site: Site, tmp_path: Path) -> None:
    folder = tmp_path / "hut"
    unload(site, folder)
    (folder / name).parent.mkdir(exist_ok=True)
    (folder / name).write_text("mine")
    with pytest.raises(WriteFailed, match="which is no part of a site folder; accepted: another name"):
        unload(site, folder, overwrite=True)
    assert (folder / name).read_text() == "mine"


def test_a_file_is_not_overwritten_by_a_folder(site: Site, tmp_path: Path) -> None:
    target = tmp_path / "hut"
    target.write_text("mine")
    with pytest.raises(WriteFailed):
        unload(site, target, overwrite=True)
    assert target.read_text() == "mine"


@pytest.fixture(params=["write_bytes", "rename"])
def full_disk(request: pytest.FixtureRequest, monkeypatch: pytest.MonkeyPatch) -> None:
    """No space: for a file, or for the new folder where it is moved into place."""
    original = getattr(Path, request.param)

    def fail(self: Path, *args: Any) -> Any:
        if request.param == "rename" and (self.name == "hut" or self.name.endswith(".old")):
            return original(self, *args)  # the old folder goes aside, and comes back
        raise OSError(errno.ENOSPC, os.strerror(errno.ENOSPC))

    monkeypatch.setattr(Path, request.param, fail)


@pytest.mark.usefixtures("full_disk")
def test_what_fails_half_way_leaves_everything_as_it_was(site: Site, tmp_path: Path) -> None:
    folder = tmp_path / "hut"
    folder.mkdir()
    (folder / "site.toml").write_text("mine")
    with pytest.raises(WriteFailed, match="No space left on device"):
        unload(site, folder, overwrite=True)
    assert names(tmp_path) == ["hut", "hut/site.toml"]


def test_the_folder_above_must_be_there(site: Site, tmp_path: Path) -> None:
    with pytest.raises(WriteFailed, match="No such file or directory"):
        unload(site, tmp_path / "gone" / "hut")
    assert names(tmp_path) == []


@pytest.mark.parametrize("name", ["../ours.toml", "general", "site.toml"])
def test_a_profile_is_written_beside_or_not_at_all(name: str, tmp_path: Path) -> None:
    with pytest.raises(AuditError, match="cannot be the file of the site's own profile"):
        unload(Site(name="hut", limits=name, own_limits="a = 1"), tmp_path / "hut")
    assert names(tmp_path) == []
