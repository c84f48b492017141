"""
What taking in a site folder costs, as a ratio to bare sqlite3 on the same CSV files.

    python tests/benchmarks/intake.py [--circuits N] [--runs N]

The ratio is that of a whole ``ohmwalk intake`` into a new site file (files read, record checked, rows, journal,
digest and indexes written) to ``csv.reader`` plus ``executemany`` into bare tables without keys, in one
transaction with the same pragmas; at most 15. Median of interleaved runs. Below it, where the time goes, and
what it costs to take the same folder in once more, which changes nothing.

For each circuit there are 1.8 runs, 1.8 loads and 7 readings: 100,000 circuits make 1,160,000 rows.
"""

from __future__ import annotations

import argparse
import csv
import sqlite3
import statistics
import tempfile
import time
from collections.abc import Callable, Iterator
from contextlib import closing, contextmanager
from itertools import cycle
from pathlib import Path

from audit.intake.into_file import take_in

AT_MOST = 15
"""What the ratio may be."""


def write_folder(folder: Path, circuits: int) -> None:
    """A site folder; four circuits of five have two runs and two loads, boards have fifty circuits."""
    folder.mkdir()
    (folder / "site.toml").write_text('name = "Generated"\nnominal = "48 V"\n', encoding="utf-8")
    boards = range(circuits // 50 + 1)
    ends = [("p1", "p2") if n % 5 else ("p1",) for n in range(circuits)]
    tables: dict[str, tuple[str, Iterator[tuple[object, ...]]]] = {
        "sources": ("source,kind,nominal [V]", iter([("RECT-1", "rectifier", 48)])),
        "boards": ("board,fed_by,location", ((f"DB{n}", "RECT-1", f"Level {n % 9}") for n in boards)),
        "circuits": (
            "circuit,fed_from,description,device,device_rating [A]",
            ((f"C{n}", f"DB{n // 50}", "Lamps", "breaker C", 10) for n in range(circuits)),
        ),
        "runs": (
            "circuit,run,from,to,length [m],length_by,size,insulation",
            (
                (f"C{n}", k, "way" if k == 1 else "p1", end, _length(n, k), "tape", "2.5 mm2", "PVC")
                for n in range(circuits)
                for k, end in enumerate(ends[n], 1)
            ),
        ),
        "loads": (
            "circuit,point,load,current [A]",
            ((f"C{n}", end, end, 1 + n % 7 / 10) for n in range(circuits) for end in ends[n]),
        ),
        "instruments": (
            "instrument,quantity,range,accuracy [%],counts,resolution",
            iter([("DMM-1", "voltage", 60, 0.5, 2, 0.01)]),
        ),
        "readings": (
            "circuit,visit,round,taken_at,quantity,at,leg,value,instrument,by",
            (
                (f"C{n}", "2026-03 as found", 1, _time(n, k), "voltage", at, "both", _volts(n, k), "DMM-1", "ann")
                for n in range(circuits)
                for k, at in zip(range(7), cycle(("bus", "way", *ends[n])), strict=False)
            ),
        ),
    }
    for table, (header, rows) in tables.items():
        with (folder / f"{table}.csv").open("w", encoding="utf-8", newline="") as file:
            writer = csv.writer(file, lineterminator="\n")
            writer.writerow(header.split(","))
            writer.writerows(rows)


def _length(circuit: int, run: int) -> float:
    return 3 + ((circuit * 2 + run) * 7919 % 997) / 10


def _time(circuit: int, reading: int) -> str:
    return f"2026-03-02T10:{circuit % 60:02}:{reading:02}"


def _volts(circuit: int, reading: int) -> float:
    return round(48 - (circuit * 31 + reading * 17) % 4001 / 1000, 3)


def bare_intake(folder: Path, target: Path) -> None:
    """``csv.reader`` and ``executemany``, one table a file, in one transaction with the site file's pragmas."""
    with closing(sqlite3.connect(target, isolation_level=None)) as connection:
        connection.execute("PRAGMA journal_mode = DELETE")
        connection.execute("PRAGMA synchronous = EXTRA")
        connection.execute("BEGIN IMMEDIATE")
        for path in sorted(folder.glob("*.csv")):
            with path.open(encoding="utf-8", newline="") as file:
                reader = csv.reader(file)
                header = next(reader)
                names = ", ".join(f'"{name}"' for name in header)
                connection.execute(f'CREATE TABLE "{path.stem}" ({names})')
                connection.executemany(f'INSERT INTO "{path.stem}" VALUES ({", ".join("?" * len(header))})', reader)
        connection.execute("COMMIT")


class Stages:
    """Seconds spent in each stage that an intake reports."""

    def __init__(self) -> None:
        self.seconds: dict[str, float] = {}
        self._name = ""
        self._since = time.perf_counter()

    def __call__(self, name: str) -> None:
        now = time.perf_counter()
        name = (
            "read the rows" if name.startswith("read the rows") else "read files" if name.startswith("read") else name
        )
        if self._name:
            self.seconds[self._name] = self.seconds.get(self._name, 0.0) + now - self._since
        self._name, self._since = name, now


@contextmanager
def timed(into: list[float]) -> Iterator[None]:
    """Append the seconds that the block takes."""
    start = time.perf_counter()
    yield
    into.append(time.perf_counter() - start)


def benchmark(folder: Path, circuits: int, runs: int, say: Callable[[str], None]) -> float:
    """Time both, interleaved, on files in a folder; the median ratio."""
    source = folder / "site"
    write_folder(source, circuits)
    ours: list[float] = []
    bare: list[float] = []
    again: list[float] = []
    stages = [Stages() for _ in range(runs)]
    for n in range(runs):
        with timed(bare):
            bare_intake(source, folder / f"bare-{n}.db")
        target = folder / f"{n}.ohmwalk"
        with timed(ours):
            take_in(target, [source], who="ann", laptop="lap", stage=stages[n])
            stages[n]("")
        with timed(again):
            assert not take_in(target, [source], who="ann", laptop="lap").is_change
        target.unlink()
        (folder / f"bare-{n}.db").unlink()
    ratios = [a / b for a, b in zip(ours, bare, strict=True)]
    ratio = statistics.median(ratios)
    say(f"{circuits:,} circuits, {sum(map(_lines, source.glob('*.csv'))):,} rows, median of {runs} runs")
    say(
        f"intake into a new file  {ratio:5.1f} × ({min(ratios):.1f} to {max(ratios):.1f}, at most {AT_MOST})"
        f"  {statistics.median(ours):7.2f} s against {statistics.median(bare):.2f} s"
    )
    for name in stages[0].seconds:
        seconds = statistics.median(stage.seconds[name] for stage in stages)
        say(f"    {name:<20}{seconds:7.2f} s  {100 * seconds / statistics.median(ours):3.0f} %")
    say(f"the same folder again   {statistics.median(again):7.2f} s, nothing changed")
    return ratio


def _lines(path: Path) -> int:
    return path.read_bytes().count(b"\n") - 1


def main() -> None:
    """Make the data in a temporary folder, run everything, print the ratio."""
    parser = argparse.ArgumentParser(description="What taking in a site folder costs, as a ratio to bare sqlite3.")
    parser.add_argument("--circuits", type=int, default=2_000)
    parser.add_argument("--runs", type=int, default=3)
    options = parser.parse_args()
    with tempfile.TemporaryDirectory() as folder:
        benchmark(Path(folder), options.circuits, options.runs, print)


if __name__ == "__main__":
    main()
