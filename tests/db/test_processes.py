"""Several programs on one file, programs that are killed, and disks that fill up: nothing acknowledged is lost."""

from __future__ import annotations

import os
import random
import subprocess
import sys
import time
from pathlib import Path

import pytest

from db.errors import NoSpace
from db.store import SiteStore
from rules.record import Reading, Site

ENTER = Path(__file__).parent / "enter_readings.py"
LIMITED = Path(__file__).parent / "limited_file_size.py"


def started(path: Path, who: str, count: int | None = None) -> subprocess.Popen[str]:
    """Another program that enters readings."""
    arguments = [sys.executable, str(ENTER), str(path), who, *([str(count)] if count else [])]
    return subprocess.Popen(arguments, stdout=subprocess.PIPE, stderr=subprocess.PIPE, text=True)


def values(site: Site, who: str) -> list[float]:
    """The values that someone entered, in the order of the rows."""
    return [reading.value for reading in site.readings if reading.round == who]


def kill_while_it_saves(path: Path, who: str, after_s: float) -> list[float]:
    """Let a program enter readings, kill it at an arbitrary moment, and give what it had acknowledged."""
    with started(path, who) as child:
        assert child.stdout is not None
        assert child.stderr is not None
        first = child.stdout.readline()
        time.sleep(after_s)
        child.kill()
        # Not communicate(): it would pass over what readline() has read ahead.
        lines = [first, *child.stdout.readlines()]
        assert child.stderr.read() == ""
    return [float(line) for line in lines if line.endswith("\n")]


def kills(path: Path, count: int) -> None:
    """Kill again and again: acknowledged and lost none, damaged none, at most one saved but not acknowledged."""
    chance = random.Random(count)
    for n in range(count):
        acknowledged = kill_while_it_saves(path, f"p{n}", chance.uniform(0, 0.12))
        with SiteStore(path) as store:
            assert store.verify() == ()
            saved = values(store.site(), f"p{n}")
        assert saved[: len(acknowledged)] == acknowledged
        assert len(saved) <= len(acknowledged) + 1


def test_kills_at_random_moments_lose_nothing(store: SiteStore, path: Path) -> None:
    store.close()
    kills(path, 5)


@pytest.mark.long
def test_a_hundred_kills_at_random_moments_lose_nothing(store: SiteStore, path: Path) -> None:
    store.close()
    kills(path, 100)


def test_what_a_killed_program_left_half_written_is_rolled_back_by_a_reader(
    store: SiteStore, path: Path, site: Site
) -> None:
    before = path.read_bytes()
    connection = store._db.conn
    connection.execute("PRAGMA cache_spill = 1")
    connection.execute("PRAGMA cache_size = 1")
    connection.execute("BEGIN IMMEDIATE")
    connection.execute("UPDATE circuits SET notes = hex(zeroblob(50000))")
    # The pages did not fit in memory: the file is half written, its journal beside it, as after a kill.
    journal = path.with_name(path.name + "-journal")
    half, undo = path.read_bytes(), journal.read_bytes()
    assert half != before
    copy = path.with_name("copy.ohmwalk")
    copy.write_bytes(half)
    copy.with_name(copy.name + "-journal").write_bytes(undo)
    connection.execute("ROLLBACK")
    with SiteStore(copy, read_only=True) as reader:
        assert reader.site() == site
        assert reader.verify() == ()


def test_two_programs_that_save_at_once_lose_nothing(store: SiteStore, path: Path) -> None:
    children = [started(path, who, 30) for who in ("ann", "bob")]
    for child in children:
        out, errors = child.communicate(timeout=300)
        assert errors == ""
        assert out.split() == [str(n) for n in range(30)]
    for who in ("ann", "bob"):
        assert values(store.site(), who) == [float(n) for n in range(30)]
    assert store.verify() == ()


def test_another_program_s_saves_are_seen_within_two_seconds(store: SiteStore, path: Path) -> None:
    version = store.version
    child = started(path, "bob", 1)
    assert child.stdout is not None
    assert child.stdout.readline() == "0\n"
    end = time.monotonic() + 2
    while store.version == version and time.monotonic() < end:
        time.sleep(0.05)
    assert values(store.site(), "bob") == [0.0]
    assert child.wait(timeout=300) == 0
    assert child.communicate()[1] == ""


# --- full disks


def full_reading(value: int) -> Reading:
    """A reading that takes some room."""
    return Reading(
        id="", circuit_id="c1", round="full", quantity="voltage", at="way", value=float(value), notes="x" * 99
    )


def save_until_full(store: SiteStore, saved: list[int]) -> None:
    """Save bundles of twenty readings until there is no space; the values that were saved go to ``saved``."""
    for bundle in range(1000):
        new = range(20 * bundle, 20 * bundle + 20)
        with store.save("ann", f"bundle {bundle}") as save:
            save.add_all("readings", [full_reading(value) for value in new])
        saved.extend(new)


def test_a_full_disk_keeps_what_was_saved_and_the_program_goes_on(store: SiteStore, path: Path) -> None:
    connection = store._db.conn
    pages = connection.execute("PRAGMA page_count").fetchone()[0]
    connection.execute(f"PRAGMA max_page_count = {pages + 20}")
    saved: list[int] = []
    with pytest.raises(NoSpace) as caught:
        save_until_full(store, saved)
    assert caught.value.exit_status == 2
    assert str(caught.value).startswith(f"{path}: no space left")
    assert len(saved) > 20
    assert store.verify() == ()
    connection.execute("PRAGMA max_page_count = 1073741823")
    with store.save("ann", "space again") as save:
        save.add("readings", full_reading(len(saved)))
    assert values(store.site(), "full") == [*saved, len(saved)]
    assert os.listdir(path.parent) == [path.name]


def limited(size: int, what: str, path: Path) -> subprocess.CompletedProcess[str]:
    """Another program that may not make files larger than ``size`` bytes, and what came of it."""
    return subprocess.run(
        [sys.executable, str(LIMITED), str(size), what, str(path)],
        capture_output=True,
        text=True,
        timeout=300,
        check=False,
    )


def test_a_limit_on_file_sizes_keeps_what_was_saved(store: SiteStore, path: Path) -> None:
    child = limited(path.stat().st_size + 30 * 4096, "save", path)
    told, saved = child.stdout.splitlines()
    assert (child.returncode, child.stderr) == (2, "")
    assert told.startswith(f"{path}: no space left")
    assert int(saved) > 1
    assert store.verify() == ()
    assert values(store.site(), "full") == [float(n) for n in range(int(saved))]


def test_a_site_file_that_does_not_fit_is_not_made(store: SiteStore, path: Path, site: Site) -> None:
    before = path.read_bytes()
    child = limited(len(before) // 2, "create", path)
    told, saved = child.stdout.splitlines()
    assert (child.returncode, child.stderr, saved) == (2, "", "0")
    assert told.startswith(f"{path}.new.ohmwalk: no space left")
    assert path.read_bytes() == before
    assert os.listdir(path.parent) == [path.name]
