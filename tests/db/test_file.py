"""What is a site file and what is not, and what opening, polling and copying one do."""

from __future__ import annotations

import os
import shutil
import sqlite3
from collections.abc import Iterator
from contextlib import closing, contextmanager
from pathlib import Path
from typing import Any

import pytest
from sqlite_utils import Database

from db import connection as opening
from db.errors import (
    BadFileName,
    DiskFault,
    FileFault,
    NewerSiteFile,
    NoSuchSite,
    NotASiteFile,
    SiteExists,
    SiteLocked,
    SiteReadOnly,
)
from db.migrations import APPLICATION_ID, migrations
from db.store import SiteStore
from rules.record import Circuit, Site


def altered(path: Path, *statements: str) -> None:
    """Run statements on a file behind the store's back."""
    with closing(sqlite3.connect(path, isolation_level=None)) as connection:
        for statement in statements:
            connection.execute(statement)


def refusal(path: Path, *, read_only: bool = False) -> FileFault:
    """Opening is refused, in one line that begins with the path, and the file stays as it was."""
    before = path.read_bytes() if path.is_file() else None
    with pytest.raises(FileFault) as caught:
        SiteStore(path, read_only=read_only)
    assert (path.read_bytes() if path.is_file() else None) == before
    assert str(caught.value).startswith(f"{path}: ")
    assert str(caught.value).isprintable()
    return caught.value


@pytest.mark.parametrize(
    "content", [b"", b"%PDF-1.7", b"SQLite format 3", b"SQLite format 3\x00", b"SQLite format 3\x00" + bytes(9000)]
)
def test_a_file_that_is_no_database_is_refused(path: Path, content: bytes) -> None:
    path.write_bytes(content)
    assert isinstance(refusal(path), NotASiteFile)
    assert refusal(path, read_only=True).exit_status == 3


def test_another_program_s_database_is_refused(path: Path) -> None:
    altered(path, "CREATE TABLE circuits (id TEXT)")
    assert "another program" in str(refusal(path))
    altered(path, f"PRAGMA application_id = {APPLICATION_ID}")
    assert "no version" in str(refusal(path))


def test_a_folder_or_nothing_at_all_is_refused(path: Path) -> None:
    assert isinstance(refusal(path), NoSuchSite)
    assert refusal(path).exit_status == 2
    assert not path.exists()
    path.mkdir()
    assert isinstance(refusal(path), NotASiteFile)


def test_a_newer_file_is_refused_as_newer(store: SiteStore, path: Path) -> None:
    store.close()
    altered(path, "PRAGMA user_version = 99")
    error = refusal(path)
    assert isinstance(error, NewerSiteFile)
    assert error.exit_status == 3
    assert "newer version of this program" in str(error)


@pytest.mark.parametrize(
    "statement",
    [
        "DROP TABLE decisions",
        "DROP INDEX runs_circuit_id_number",
        "ALTER TABLE boards ADD COLUMN colour TEXT",
        "CREATE TRIGGER t AFTER INSERT ON readings BEGIN DELETE FROM readings; END",
        "CREATE VIEW v AS SELECT 1",
    ],
)
def test_a_file_whose_schema_was_altered_is_refused(store: SiteStore, path: Path, statement: str) -> None:
    store.close()
    altered(path, statement)
    assert "damaged or was altered" in str(refusal(path))


def test_statistics_that_sqlite_gathered_do_no_harm(store: SiteStore, path: Path, site: Site) -> None:
    store.close()
    altered(path, "ANALYZE")
    with SiteStore(path) as again:
        assert again.site() == site


def test_a_name_with_control_codes_stays_on_one_line(tmp_path: Path) -> None:
    with pytest.raises(NoSuchSite) as caught:
        SiteStore(tmp_path / "a\nb\x1b[2J.ohmwalk")
    assert str(caught.value).isprintable()
    with pytest.raises(NoSuchSite) as caught:
        SiteStore(tmp_path / os.fsdecode(b"\xff.ohmwalk"))
    assert str(caught.value).isprintable()


@pytest.mark.parametrize("name", ["a?mode=memory#%41.ohmwalk", "with space.ohmwalk", "\xfc\u202e.ohmwalk", "-.ohmwalk"])
def test_any_name_that_the_disk_takes_is_taken(tmp_path: Path, site: Site, name: str) -> None:
    SiteStore.create(tmp_path / name, site, "ann", "lap", "new").close()
    with SiteStore(tmp_path / name) as store:
        assert store.site() == site
    assert os.listdir(tmp_path) == [name]


# --- making


def test_nothing_is_overwritten(path: Path) -> None:
    path.write_text("mine")
    with pytest.raises(SiteExists) as caught:
        SiteStore.create(path, None, "ann", "lap", "new")
    assert caught.value.exit_status == 2
    assert path.read_text() == "mine"


def test_a_site_file_s_name_ends_in_ohmwalk(tmp_path: Path) -> None:
    with pytest.raises(BadFileName):
        SiteStore.create(tmp_path / "a.db", None, "ann", "lap", "new")
    assert os.listdir(tmp_path) == []


def test_a_site_that_does_not_hold_together_makes_no_file(tmp_path: Path, site: Site) -> None:
    twice = site.with_rows("circuits", (*site.circuits, Circuit(id="c3", tag="DB1-01")))
    with pytest.raises(Exception, match="DB1-01"):
        SiteStore.create(tmp_path / "a.ohmwalk", twice, "ann", "lap", "new")
    assert os.listdir(tmp_path) == []


def test_a_folder_that_is_not_there_is_told(tmp_path: Path) -> None:
    with pytest.raises(FileFault) as caught:
        SiteStore.create(tmp_path / "nowhere" / "a.ohmwalk", None, "ann", "lap", "new")
    assert caught.value.exit_status == 2


def test_a_site_file_is_made_where_the_disk_has_no_hard_links(
    path: Path, site: Site, monkeypatch: pytest.MonkeyPatch
) -> None:
    def refuse(*_: object) -> None:
        raise OSError(1, "Operation not permitted")

    monkeypatch.setattr(os, "link", refuse)
    with SiteStore.create(path, site, "ann", "lap", "new") as store:
        assert store.site() == site
    assert os.listdir(path.parent) == [path.name]


def test_the_file_is_set_as_designed(store: SiteStore, path: Path) -> None:
    def pragma(name: str) -> Any:
        return store._db.conn.execute(f"PRAGMA {name}").fetchone()[0]

    assert {name: pragma(name) for name in ("foreign_keys", "journal_mode", "synchronous", "trusted_schema")} == {
        "foreign_keys": 1,
        "journal_mode": "delete",
        "synchronous": 3,
        "trusted_schema": 0,
    }
    assert pragma("busy_timeout") == 5000
    assert pragma("application_id") == APPLICATION_ID
    assert os.listdir(path.parent) == [path.name]


# --- reading only, and where writing is not allowed


@contextmanager
def without_permission(path: Path) -> Iterator[None]:
    """Write-protect a file and its folder; the superuser, who may do everything, becomes nobody meanwhile."""
    folder = path.parent
    path.chmod(0o444)
    folder.chmod(0o555)
    is_root = os.geteuid() == 0
    if is_root:
        os.seteuid(65534)
    try:
        yield
    finally:
        if is_root:
            os.seteuid(0)
        folder.chmod(0o755)
        path.chmod(0o644)


@pytest.fixture
def shared(site: Site) -> Iterator[Path]:
    """A site file in a folder that everybody may look into, as pytest's own may not be."""
    import tempfile

    with tempfile.TemporaryDirectory() as folder:
        Path(folder).chmod(0o755)
        path = Path(folder) / "a.ohmwalk"
        SiteStore.create(path, site, "ann", "lap", "new").close()
        yield path


def test_a_file_that_may_not_be_written_can_be_read_and_says_so(shared: Path, site: Site) -> None:
    before = shared.read_bytes()
    with without_permission(shared):
        with pytest.raises(SiteReadOnly, match="may not be written") as caught:
            SiteStore(shared)
        assert caught.value.exit_status == 2
        with SiteStore(shared, read_only=True) as store:
            assert store.site() == site
            assert store.verify() == ()
            with pytest.raises(SiteReadOnly), store.save("ann", "no") as save:
                save.settings(name="no")
            with pytest.raises(SiteReadOnly):
                store.undo("ann")
        with pytest.raises(SiteReadOnly):
            SiteStore.create(shared.with_name("b.ohmwalk"), None, "ann", "lap", "new")
    assert shared.read_bytes() == before


def test_permission_that_goes_while_the_file_is_open_is_told_at_the_save(shared: Path, site: Site) -> None:
    with SiteStore(shared) as store:
        with without_permission(shared), pytest.raises(SiteReadOnly), store.save("ann", "no") as save:
            save.settings(name="no")
        assert store.site() == site
        with store.save("ann", "now") as save:
            save.settings(name="now")


def test_reading_leaves_the_bytes_alone(store: SiteStore, path: Path) -> None:
    store.close()
    before, when = path.read_bytes(), path.stat().st_mtime_ns
    with SiteStore(path, read_only=True) as reader:
        reader.site()
        reader.history()
        reader.verify()
        assert reader.undoable("ann") is None
    assert (path.read_bytes(), path.stat().st_mtime_ns) == (before, when)


# --- an older file


@pytest.fixture
def later_step(monkeypatch: pytest.MonkeyPatch) -> None:
    """A further step, as a later version of this program may have it."""
    monkeypatch.setattr(migrations, "_migrations", list(migrations._migrations))

    @migrations()
    def m003_index_places(db: Database) -> None:
        db.execute("CREATE INDEX boards_location ON boards (location)")
        db.execute("PRAGMA user_version = 3")


@pytest.mark.usefixtures("later_step")
def test_an_older_file_is_brought_up_to_date_in_memory_to_be_read_and_for_good_to_be_written(
    store: SiteStore, path: Path, site: Site
) -> None:
    store.close()
    before = path.read_bytes()
    with SiteStore(path, read_only=True) as reader:
        assert reader.site() == site
        assert reader._db.conn.execute("PRAGMA user_version").fetchone() == (3,)
        assert reader.verify() == ()
    assert path.read_bytes() == before
    with SiteStore(path) as writer:
        assert writer._db.conn.execute("PRAGMA user_version").fetchone() == (3,)
        with writer.save("ann", "on") as save:
            save.settings(name="on")
        assert writer.verify() == ()
    with SiteStore(path, read_only=True) as reader:
        assert reader.site().name == "on"


def test_a_step_that_fails_leaves_the_file_as_it_was(
    store: SiteStore, path: Path, site: Site, monkeypatch: pytest.MonkeyPatch
) -> None:
    store.close()
    before = path.read_bytes()
    with monkeypatch.context() as patch:
        patch.setattr(migrations, "_migrations", list(migrations._migrations))

        @migrations()
        def m002_fails(db: Database) -> None:
            db.execute("DELETE FROM readings")
            raise ZeroDivisionError

        with pytest.raises(ZeroDivisionError):
            SiteStore(path)
    assert path.read_bytes() == before
    with SiteStore(path) as again:
        assert again.site() == site


# --- several programs


def test_another_s_save_changes_the_version_and_so_does_one_s_own(store: SiteStore, path: Path) -> None:
    with SiteStore(path) as other:
        seen = other.version
        assert other.version == seen
        with store.save("ann", "note") as save:
            save.settings(notes="seen by the other")
        assert other.version != seen
        assert other.site().notes == "seen by the other"
        mine = store.version
        with store.save("ann", "note") as save:
            save.settings(notes="")
        assert store.version != mine


def test_a_file_that_stays_locked_is_told_and_nothing_is_lost(
    store: SiteStore, path: Path, site: Site, monkeypatch: pytest.MonkeyPatch
) -> None:
    monkeypatch.setattr(opening, "BUSY_TIMEOUT_S", 0.05)
    with closing(sqlite3.connect(path, isolation_level=None)) as other, SiteStore(path) as impatient:
        other.execute("BEGIN EXCLUSIVE")
        with pytest.raises(SiteLocked) as caught, impatient.save("ann", "no") as save:
            save.settings(name="no")
        assert caught.value.exit_status == 2
        with pytest.raises(SiteLocked):
            impatient.site()
        other.execute("ROLLBACK")
        assert impatient.site() == site


def test_a_reader_in_the_way_of_a_commit_leaves_the_save_undone(
    store: SiteStore, path: Path, site: Site, monkeypatch: pytest.MonkeyPatch
) -> None:
    monkeypatch.setattr(opening, "BUSY_TIMEOUT_S", 0.05)
    with closing(sqlite3.connect(path, isolation_level=None)) as reader, SiteStore(path) as impatient:
        reader.execute("BEGIN")
        reader.execute("SELECT * FROM site").fetchall()
        with pytest.raises(SiteLocked), impatient.save("ann", "no") as save:
            save.settings(name="no")
        reader.execute("ROLLBACK")
        assert impatient.site() == site
        with impatient.save("ann", "now") as save:
            save.settings(name="now")
        assert impatient.site().name == "now"


def test_another_thread_s_use_of_a_store_is_a_fault_of_the_program(store: SiteStore) -> None:
    from concurrent.futures import ThreadPoolExecutor

    with ThreadPoolExecutor(1) as pool, pytest.raises(sqlite3.ProgrammingError):
        pool.submit(store.site).result()


# --- copies


def test_a_plain_copy_between_two_saves_is_complete_while_the_file_is_open(store: SiteStore, path: Path) -> None:
    with store.save("ann", "last") as save:
        save.settings(notes="the last word")
    copy = path.with_name("copy.ohmwalk")
    shutil.copy(path, copy)
    with SiteStore(copy, read_only=True) as reader:
        assert reader.site() == store.site()
        assert reader.verify() == ()


def test_a_backup_is_a_site_file_of_its_own(store: SiteStore, path: Path, site: Site) -> None:
    target = path.with_name("backup.ohmwalk")
    store.backup(target)
    with SiteStore(target, laptop="lap") as copy:
        assert copy.site() == site
        assert copy.verify() == ()
        assert copy.history() == store.history()
    with pytest.raises(SiteExists):
        store.backup(target)
    with store.save("ann", "on") as save:
        save.settings(name="on")
    store.backup(target, overwrite=True)
    with SiteStore(target) as copy:
        assert copy.site().name == "on"
    with pytest.raises(BadFileName):
        store.backup(path.with_name("backup.sqlite"))
    with pytest.raises(FileFault):
        store.backup(path / "within-a-file.ohmwalk")
    assert sorted(os.listdir(path.parent)) == ["backup.ohmwalk", "pump.ohmwalk"]


def test_a_fault_of_the_disk_is_told(path: Path, monkeypatch: pytest.MonkeyPatch) -> None:
    def fail(_: int) -> None:
        raise OSError(5, "Input/output error")

    monkeypatch.setattr(os, "fsync", fail)
    with pytest.raises(DiskFault, match="Input/output error"):
        SiteStore.create(path, None, "ann", "lap", "new")
    assert os.listdir(path.parent) == []


def test_no_backup_is_laid_beside_the_journal_of_an_interrupted_save(tmp_path: Path) -> None:
    """SQLite would roll the old file's journal back into the new one."""
    target = tmp_path / "copy.ohmwalk"
    with SiteStore.create(tmp_path / "a.ohmwalk", None, "ann", "laptop", "new") as store:
        store.backup(target)
        before = target.read_bytes()
        journal = tmp_path / "copy.ohmwalk-journal"
        journal.write_bytes(b"half a save")
        with pytest.raises(SiteExists, match="interrupted"):
            store.backup(target, overwrite=True)
        assert target.read_bytes() == before
        journal.unlink()
        store.backup(target, overwrite=True)
