"""
What the site file costs, as ratios to bare sqlite3 on the same rows.

    python tests/benchmarks/store.py [CIRCUITS] [--runs N]

Prints three ratios, each the median of several interleaved runs, with the smallest and largest:

- load: ``store.site()`` against ``fetchall`` of the same rows (at most 6)
- intake: a site into a site file, journal, digest, checks and indexes included, against ``csv.reader``
  and ``executemany`` into bare tables (at most 15); into a new file, and into one that is there
- saved reading: one ``store.save`` of one reading against one bare transaction of the same row with the
  same pragmas (at most 5)

The data are made in memory: for each circuit 1.8 runs, 1.8 loads and 7 readings (a hundred thousand
circuits make 1,060,000 rows). Garbage collection is left as a program has it.
"""

from __future__ import annotations

import argparse
import csv
import io
import sqlite3
import statistics
import tempfile
import time
from collections.abc import Callable
from contextlib import closing
from dataclasses import replace
from pathlib import Path

from db.lookup import names, select
from db.schema import SCHEMA
from db.store import SiteStore
from rules.record import TABLES, Board, Circuit, Feed, Instrument, Load, Reading, Row, Run, Site, Source, row_id

TABLES_USED = ("circuits", "runs", "loads", "readings")
READINGS_SAVED = 40


def generated(circuits: int) -> Site:
    """A site with boards of fifty circuits; four circuits of five have two runs and two loads."""
    source = Source(id="rect", tag="RECT-1", kind="rectifier", nominal_voltage_v=48.0)
    meter = Instrument(id="dmm", tag="DMM-1", quantity="voltage", accuracy_percent=0.5, counts=2.0, resolution=0.01)
    boards = [
        Board(id=row_id("boards", f"DB{n}"), tag=f"DB{n}", fed_by=(Feed("sources", "rect"),), location=f"Level {n % 9}")
        for n in range(circuits // 50 + 1)
    ]
    rows: dict[str, list[Row]] = {table: [] for table in TABLES_USED}
    for n in range(circuits):
        id_ = row_id("circuits", f"C{n}")
        feed = Feed("boards", boards[n // 50].id)
        rows["circuits"].append(
            Circuit(id=id_, tag=f"C{n}", fed_from=feed, description="Lamps", device="breaker C", rated_current_a=10.0)
        )
        ends = ("p1", "p2") if n % 5 else ("p1",)
        for number, end in enumerate(ends, start=1):
            length = 3.0 + (n * 7919 % 997) / 10
            rows["runs"].append(
                Run(
                    id=row_id("runs", id_, number),
                    circuit_id=id_,
                    number=number,
                    from_point="way" if number == 1 else "p1",
                    to_point=end,
                    one_way_length_m=length,
                    length_by="tape",
                    size="2.5 mm2",
                    insulation="PVC",
                )
            )
            rows["loads"].append(
                Load(id=row_id("loads", id_, end), circuit_id=id_, point=end, tag=end, current_a=1.0 + n % 7 / 10)
            )
        for number in range(7):
            rows["readings"].append(
                Reading(
                    id=f"{n * 7 + number:032x}",
                    circuit_id=id_,
                    visit="2026-03 as found",
                    round="1",
                    taken_at=f"2026-03-02T10:{n % 60:02}:{number:02}",
                    quantity="voltage",
                    at=("way", *ends)[number % (len(ends) + 1)],
                    leg="both",
                    value=48 - (n * 31 + number * 17) % 4001 / 1000,
                    instrument="DMM-1",
                    by="ann",
                )
            )
    return Site(
        name="Generated",
        sources=(source,),
        boards=tuple(boards),
        instruments=(meter,),
        **{table: tuple(of_table) for table, of_table in rows.items()},  # type: ignore[arg-type]
    )


def timed(job: Callable[[], object]) -> float:
    """Seconds that a job takes."""
    start = time.perf_counter()
    job()
    return time.perf_counter() - start


def fetch(path: Path) -> None:
    """The bare fetch: every column of every row that a site is built from."""
    with closing(sqlite3.connect(path)) as connection:
        for table in TABLES:
            connection.execute(f'SELECT * FROM "{table}"').fetchall()


def as_csv(path: Path) -> dict[str, str]:
    """The tables of a site file as CSV text, a header first."""
    texts = {}
    with closing(sqlite3.connect(path)) as connection:
        for table in TABLES:
            out = io.StringIO()
            csv.writer(out).writerows(connection.execute(select(table)))
            texts[table] = out.getvalue()
    return texts


def bare_intake(path: Path, texts: dict[str, str]) -> None:
    """``csv.reader`` and ``executemany`` into tables without keys, indexes or journal, in one transaction."""
    with closing(bare(path)) as connection:
        connection.execute("BEGIN IMMEDIATE")
        for table, text in texts.items():
            columns = SCHEMA[table].columns
            connection.execute(f"CREATE TABLE {table} ({names(columns)})")
            marks = ", ".join("?" * len(columns))
            connection.executemany(f"INSERT INTO {table} VALUES ({marks})", csv.reader(io.StringIO(text)))
        connection.execute("COMMIT")


def bare(path: Path) -> sqlite3.Connection:
    """A connection with the pragmas of a site file."""
    connection = sqlite3.connect(path, isolation_level=None)
    connection.execute("PRAGMA journal_mode = DELETE")
    connection.execute("PRAGMA synchronous = EXTRA")
    return connection


def new_intake(path: Path, site: Site) -> None:
    """A site into a new file."""
    SiteStore.create(path, site, "ann", "laptop", "intake").close()


def later_intake(path: Path, site: Site) -> None:
    """A site into a file that is there, without rows."""
    with SiteStore(path) as store, store.save("ann", "intake") as save:
        save.put(site)


def report(name: str, ours: list[float], theirs: list[float], most: float) -> None:
    """One line: the median ratio with its spread, and the medians themselves."""
    ratios = [a / b for a, b in zip(ours, theirs, strict=True)]
    print(
        f"{name:<24} {statistics.median(ratios):5.1f} × ({min(ratios):.1f} to {max(ratios):.1f}, at most {most:g})"
        f"   {statistics.median(ours):8.4f} s against {statistics.median(theirs):8.4f} s"
    )


def main() -> None:
    """Make the data, run everything interleaved, print the ratios."""
    parser = argparse.ArgumentParser(description="What the site file costs, as ratios to bare sqlite3.")
    parser.add_argument("circuits", nargs="?", type=int, default=5_000)
    parser.add_argument("--runs", type=int, default=5)
    options = parser.parse_args()
    site = generated(options.circuits)
    count = sum(len(site.table(table)) for table in TABLES)
    print(f"{options.circuits} circuits, {count} rows, median of {options.runs} runs")
    with tempfile.TemporaryDirectory() as folder:
        benchmark(Path(folder), site, options.runs)


def benchmark(folder: Path, site: Site, runs: int) -> None:
    """Run all of it, interleaved, on files in a folder."""
    path = folder / "site.ohmwalk"
    new_intake(path, site)
    print(f"file: {path.stat().st_size / 1e6:.1f} MB")
    texts = as_csv(path)
    times: dict[str, list[float]] = {name: [] for name in ("load", "fetch", "new", "later", "csv", "save", "row")}
    reading = site.readings[0]
    with SiteStore(path, laptop="laptop") as store, closing(bare(folder / "bare.db")) as connection:
        connection.execute(f"CREATE TABLE readings ({names(SCHEMA['readings'].columns)})")
        for _ in range(runs):
            times["fetch"].append(timed(lambda: fetch(path)))
            times["load"].append(timed(store.site))
            for name, job in (
                ("csv", lambda target: bare_intake(target, texts)),
                ("new", lambda target: new_intake(target, site)),
                ("later", lambda target: later_intake(target, site)),
            ):
                target = folder / f"{name}.ohmwalk"
                if name == "later":
                    SiteStore.create(target, None, "ann", "laptop", "new").close()
                times[name].append(timed(lambda job=job, target=target: job(target)))  # type: ignore[misc]
                target.unlink()
            for _ in range(READINGS_SAVED):
                times["save"].append(timed(lambda: save_one(store, reading)))
                times["row"].append(timed(lambda: insert_one(connection, reading)))
    report("load", times["load"], times["fetch"], 6)
    report("intake, new file", times["new"], times["csv"], 15)
    report("intake, file there", times["later"], times["csv"], 15)
    report("one saved reading", times["save"], times["row"], 5)


def save_one(store: SiteStore, reading: Reading) -> None:
    """One saved reading."""
    with store.save("ann", "reading") as save:
        save.add("readings", replace(reading, id=""))


def insert_one(connection: sqlite3.Connection, reading: Reading) -> None:
    """The same row in a bare transaction."""
    values = ["0" * 32, 0, *(getattr(reading, field.name) for field in SCHEMA["readings"].fields), "[]"]
    connection.execute("BEGIN IMMEDIATE")
    connection.execute(f"INSERT INTO readings VALUES ({', '.join('?' * len(values))})", values)
    connection.execute("COMMIT")


if __name__ == "__main__":
    main()
