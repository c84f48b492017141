"""
How long the terminal interface takes to show its first screenful, with 10,000 circuits against 10.

    python tests/benchmarks/first_paint.py [CIRCUITS] [--runs N]

Starts the program in a pseudo-terminal of 80 × 24, and stops the clock when the tag of the tenth circuit has been
written to it: the first screenful is then visible, statuses may follow. Prints the medians and their ratio (at
most 2), the smallest and largest of interleaved runs, and how long all statuses took.
"""

from __future__ import annotations

import argparse
import fcntl
import os
import pty
import select
import signal
import statistics
import struct
import sys
import tempfile
import termios
import time
from pathlib import Path

from db.store import SiteStore
from rules.record import Board, Circuit, Feed, Load, Reading, Run, Site, Source, row_id

START = (
    "import sys; from pathlib import Path; from audit.tui.run import run_survey; "
    "from audit.tui.settings import PassingSettings; "
    "sys.exit(run_survey(Path(sys.argv[1]), PassingSettings('benchmark', 'benchmark')))"
)
TENTH = b"C0-09"
"""Tag of the tenth circuit."""
JUDGED = b"? measure"
PATIENCE_S = 120.0


def generated(circuits: int) -> Site:
    """Boards of twenty circuits; four of five circuits have two runs and two loads; two rounds on each."""
    source = Source(id="rect", tag="RECT", kind="rectifier", nominal_voltage_v=48.0, working_voltage_v=53.5)
    boards: list[Board] = []
    rows: dict[str, list[object]] = {"circuits": [], "runs": [], "loads": [], "readings": []}
    for n in range(circuits):
        if n % 20 == 0:
            tag = f"C{n // 20}"
            boards.append(
                Board(
                    id=row_id("boards", tag), tag=tag, fed_by=(Feed("sources", "rect"),), location=f"Level {n // 200}"
                )
            )
        tag = f"{boards[-1].tag}-{n % 20:02}"
        id_ = row_id("circuits", tag)
        rows["circuits"].append(
            Circuit(id=id_, tag=tag, fed_from=Feed("boards", boards[-1].id), description=f"Lamps {n}", device="none")
        )
        ends = ("p1", "p2") if n % 5 else ("p1",)
        for number, end in enumerate(ends, start=1):
            start = "way" if number == 1 else "p1"
            run = Run(
                id=row_id("runs", id_, number), circuit_id=id_, number=number, from_point=start, to_point=end,
                one_way_length_m=3.0 + n % 40, size="2.5 mm2",
            )  # fmt: skip
            rows["runs"].append(run)
            rows["loads"].append(Load(id=row_id("loads", id_, end), circuit_id=id_, point=end, tag=end, power_w=20.0))
        for name in ("1", "2"):
            values = [
                ("current", "way", 0.8),
                *(("voltage", at, 53.4 - 0.1 * m) for m, at in enumerate(("way", *ends))),
            ]
            rows["readings"] += [
                Reading(
                    id=row_id("readings", id_, name, at, quantity), circuit_id=id_, visit="1", round=name,
                    quantity=quantity, at=at, value=value,
                )
                for quantity, at, value in values
            ]  # fmt: skip
    tables = {table: tuple(of_table) for table, of_table in rows.items()}
    return Site(name="Generated", sources=(source,), boards=tuple(boards), **tables)  # type: ignore[arg-type]


def start(site_file: Path) -> tuple[int, int]:
    """The program in a pseudo-terminal: its process id and the terminal's end."""
    process, terminal = pty.fork()
    if process == 0:
        os.environ |= {"TERM": "xterm-256color", "COLORTERM": "truecolor"}
        os.execv(sys.executable, [sys.executable, "-c", START, str(site_file)])
    fcntl.ioctl(terminal, termios.TIOCSWINSZ, struct.pack("HHHH", 24, 80, 0, 0))
    return process, terminal


def seconds_until(site_file: Path, *wanted: bytes) -> list[float]:
    """Seconds from the start until each of some texts was written, in this order."""
    begin = time.perf_counter()
    process, terminal = start(site_file)
    written, took, last_word = bytearray(), list[float](), begin + PATIENCE_S
    try:
        for text in wanted:
            while text not in written:
                if time.perf_counter() > last_word:
                    raise TimeoutError(f"{text!r} was not written: {bytes(written[-400:])!r}")
                if select.select([terminal], [], [], 0.2)[0]:
                    written += os.read(terminal, 65_536)
            took.append(time.perf_counter() - begin)
        return took
    finally:
        os.kill(process, signal.SIGKILL)
        os.waitpid(process, 0)
        os.close(terminal)


def main() -> None:
    """Measure and print."""
    parser = argparse.ArgumentParser(description=__doc__, formatter_class=argparse.RawDescriptionHelpFormatter)
    parser.add_argument("circuits", type=int, nargs="?", default=10_000)
    parser.add_argument("--runs", type=int, default=5)
    options = parser.parse_args()
    with tempfile.TemporaryDirectory() as folder:
        files = {number: Path(folder) / f"{number}.ohmwalk" for number in (10, options.circuits)}
        for number, file in files.items():
            SiteStore.create(file, generated(number), "benchmark", "benchmark", "made").close()
        took: dict[int, list[list[float]]] = {number: [] for number in files}
        for _ in range(options.runs):
            for number, file in files.items():
                took[number].append(seconds_until(file, TENTH, JUDGED))
    for number, runs in took.items():
        for what, times in zip(("first screenful", "its statuses"), zip(*runs, strict=True), strict=True):
            print(
                f"{number:>7} circuits, {what}: {statistics.median(times):.2f} s ({min(times):.2f} to {max(times):.2f})"
            )
    small, large = (statistics.median(run[0] for run in took[number]) for number in files)
    print(f"ratio of the first screenful: {large / small:.2f}")


if __name__ == "__main__":
    main()
