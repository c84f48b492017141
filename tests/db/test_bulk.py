"""Very many rows at once: as whole, and as easily given up, as a few."""

from __future__ import annotations

import re
import runpy
import subprocess
import sys
from pathlib import Path

import pytest

from db.errors import DuplicateTag
from db.migrations import expected, newest, schema_of
from db.store import SiteStore
from rules.record import Circuit, Site, rows_of

BENCHMARK = Path(__file__).parent.parent / "benchmarks" / "store.py"


@pytest.fixture(scope="module")
def large() -> Site:
    """More than five thousand readings: their indexes are made after them."""
    site: Site = runpy.run_path(str(BENCHMARK))["generated"](800)
    assert len(site.readings) > 5000
    return site


def test_a_large_site_comes_back_whole_with_its_indexes(path: Path, large: Site) -> None:
    with SiteStore.create(path, None, "ann", "lap", "new") as store:
        with store.save("ann", "intake") as save:
            save.put(large)
        assert list(rows_of(store.site())) == list(rows_of(large))
        assert store.verify() == ()
        assert schema_of(store._db.conn) == expected(newest())
    with SiteStore(path, read_only=True) as store:  # too large a last save to be looked at on opening
        assert store.site() == large


def test_a_large_save_that_is_refused_leaves_the_file_byte_for_byte(path: Path, large: Site) -> None:
    with SiteStore.create(path, None, "ann", "lap", "new") as store:
        store._db.conn.execute("PRAGMA cache_size = 10")  # the pages do not fit: half of the save gets into the file
        before = path.read_bytes()
        twice = large.with_rows("circuits", (*large.circuits, Circuit(id="twice", tag=large.circuits[0].tag)))
        save = store.save("ann", "intake")
        with pytest.raises(DuplicateTag), save as asked:
            asked.put(twice)
        assert path.read_bytes() == before
        assert schema_of(store._db.conn) == expected(newest())


def test_a_second_large_site_beside_the_first_is_put_under_ids_of_its_own(path: Path, large: Site) -> None:
    with SiteStore.create(path, large, "ann", "lap", "intake") as store:
        with pytest.raises(DuplicateTag), store.save("ann", "again") as save:
            save.put(large)
        assert store.site() == large


def test_rows_without_ids_can_be_put(path: Path) -> None:
    site = Site(name="no ids", circuits=(Circuit(id="", tag="A"), Circuit(id="", tag="B")))
    with SiteStore.create(path, site, "ann", "lap", "intake") as store:
        assert [circuit.tag for circuit in store.site().circuits] == ["A", "B"]
        with store.save("ann", "more") as save:
            save.put(Site(name="more", circuits=(Circuit(id="", tag="C"), Circuit(id="", tag="D"))))
        assert [circuit.tag for circuit in store.site().circuits] == ["A", "B", "C", "D"]
        assert store.verify() == ()


def test_the_benchmark_prints_its_ratios() -> None:
    child = subprocess.run(
        [sys.executable, str(BENCHMARK), "20", "--runs", "1"], capture_output=True, text=True, timeout=60, check=True
    )
    for name in ("load", "intake, new file", "intake, file there", "one saved reading"):
        assert re.search(rf"^{name} +\d+\.\d ×", child.stdout, re.MULTILINE)
