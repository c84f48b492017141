"""A file that is emptied, cut short, moved or replaced while it is open: one line, and nothing is saved elsewhere."""

from __future__ import annotations

import os
import shutil
from collections.abc import Callable
from pathlib import Path

import pytest

from db.errors import AnotherFile, FileFault, NoSuchSite, NotASiteFile
from db.store import SiteStore
from rules.record import Site, Visit

Harm = Callable[[Path, Path], object]


def emptied(path: Path, other: Path) -> None:
    os.truncate(path, 0)


def cut_short(path: Path, other: Path) -> None:
    os.truncate(path, path.stat().st_size // 2)


def spoilt(path: Path, other: Path) -> None:
    path.write_bytes(b"no database" * 1_000)


def removed(path: Path, other: Path) -> None:
    path.unlink()


def moved(path: Path, other: Path) -> None:
    path.rename(path.with_name("moved.ohmwalk"))


def folder_removed(path: Path, other: Path) -> None:
    shutil.rmtree(path.parent)


def replaced(path: Path, other: Path) -> None:
    os.replace(other, path)


def written_over(path: Path, other: Path) -> None:
    shutil.copyfile(other, path)


HARMS: list[tuple[Harm, type[FileFault], str]] = [
    (emptied, NotASiteFile, "this site file was emptied while it was open"),
    (cut_short, NotASiteFile, "this site file is damaged (database disk image is malformed)"),
    (spoilt, NotASiteFile, "not a site file (file is not a database)"),
    (removed, NoSuchSite, "this file was removed or moved away while it was open"),
    (moved, NoSuchSite, "this file was removed or moved away while it was open"),
    (folder_removed, NoSuchSite, "this file was removed or moved away while it was open"),
    (replaced, AnotherFile, "another file has taken this name since it was opened; open it again"),
    (written_over, AnotherFile, "another site was written over this file; open it again"),
]  # fmt: skip


@pytest.fixture
def other(tmp_path_factory: pytest.TempPathFactory) -> Path:
    """Another site."""
    path = tmp_path_factory.mktemp("other") / "other.ohmwalk"
    SiteStore.create(path, Site(name="Other"), "Bob", "lap", "made").close()
    return path


def add_a_visit(store: SiteStore) -> None:
    with store.save("Ann", "a visit") as save:
        save.add("visits", Visit(id="", tag="another"))


USES: list[Callable[[SiteStore], object]] = [
    add_a_visit,
    SiteStore.site,
    SiteStore.history,
    lambda store: store.undo("Ann"),
    lambda store: store.undoable("Ann"),
]  # fmt: skip


@pytest.mark.parametrize(("harm", "kind", "line"), HARMS, ids=lambda part: getattr(part, "__name__", ""))
@pytest.mark.parametrize("was_read", [True, False])
def test_every_use_of_a_file_that_is_another_now_ends_in_one_line(
    store: SiteStore, path: Path, other: Path, harm: Harm, kind: type[FileFault], line: str, was_read: bool
) -> None:
    if was_read:
        store.site()
    harm(path, other)
    for use in USES:
        with pytest.raises(FileFault) as raised:
            use(store)
        assert type(raised.value) is kind
        assert str(raised.value) == f"{path}: {line}"
    if kind is AnotherFile:
        with SiteStore(path, read_only=True) as there:
            assert there.site() == Site(name="Other")


@pytest.mark.parametrize("harm", [removed, moved, replaced])
def test_a_file_that_is_gone_is_seen_without_reading_it(store: SiteStore, path: Path, other: Path, harm: Harm) -> None:
    assert store.version
    harm(path, other)
    with pytest.raises(FileFault):
        _ = store.version


def test_what_was_removed_while_it_was_open_can_still_be_backed_up(
    store: SiteStore, path: Path, site: Site, tmp_path: Path
) -> None:
    path.unlink()
    store.backup(tmp_path / "rescued.ohmwalk")
    with SiteStore(tmp_path / "rescued.ohmwalk", read_only=True) as rescued:
        assert rescued.site() == site


def test_what_was_emptied_is_not_backed_up(store: SiteStore, path: Path, tmp_path: Path) -> None:
    os.truncate(path, 0)
    with pytest.raises(NotASiteFile, match="was emptied"):
        store.backup(tmp_path / "copy.ohmwalk")
    assert not (tmp_path / "copy.ohmwalk").exists()


def test_a_file_that_comes_back_is_used_again(store: SiteStore, path: Path) -> None:
    away = path.rename(path.with_name("away.ohmwalk"))
    with pytest.raises(NoSuchSite):
        add_a_visit(store)
    away.rename(path)
    add_a_visit(store)
    assert [visit.tag for visit in store.site().visits][-1] == "another"


def test_a_file_made_read_only_while_it_is_open_loses_nothing(store: SiteStore, path: Path) -> None:
    path.chmod(0o444)
    try:
        add_a_visit(store)
        kept = True
    except FileFault:
        kept = False
    path.chmod(0o644)
    with SiteStore(path, read_only=True) as again:
        assert ("another" in [visit.tag for visit in again.site().visits]) == kept
