"""The installed program in a real terminal of 80 × 24, driven through tmux."""

from __future__ import annotations

import os
import shutil
import subprocess
import sys
import time
from collections.abc import Iterator
from dataclasses import dataclass
from pathlib import Path

import pytest

from rules.record import Feed
from tests.audit.tui.walker import site_of

ROOT = Path(__file__).parents[3]
PATIENCE_S = 120.0


@dataclass
class Terminal:
    """A tmux server of our own with one window."""

    socket: Path
    home: Path

    def tmux(self, *words: str) -> str:
        command = ["tmux", "-f", os.devnull, "-S", str(self.socket), *words]
        return subprocess.run(command, capture_output=True, text=True, check=True).stdout

    def open(self, site_file: Path) -> None:
        """Start ``ohmwalk survey`` in a fresh window of 80 × 24."""
        program = Path(sys.executable).with_name("ohmwalk")
        variables = {
            "PYTHONPATH": str(ROOT),
            "OHMWALK_HOME": str(self.home),
            "LC_ALL": "C.UTF-8",
            "TERM": "screen-256color",
        }
        words = [
            "env",
            *(f"{name}={value}" for name, value in variables.items()),
            str(program),
            "survey",
            str(site_file),
        ]
        self.tmux("new-session", "-d", "-x", "80", "-y", "24", *words, "--by", "Ada")

    @property
    def screen(self) -> str:
        return self.tmux("capture-pane", "-p")

    def shows(self, text: str) -> str:
        """The screen once a text is on it."""
        last = time.monotonic() + PATIENCE_S
        while text not in (screen := self.screen):
            assert time.monotonic() < last, f"{text!r} is not shown:\n{screen}"
            time.sleep(0.05)
        return screen

    def keys(self, *keys: str) -> None:
        """Press keys, all in one burst, as they come over a slow line; tmux's names, texts with a leading =."""
        for key in keys:
            self.tmux("send-keys", *(("-l", key[1:]) if key.startswith("=") else (key,)))

    def kill(self) -> None:
        """Kill the terminal with everything in it."""
        pid = self.tmux("display-message", "-p", "#{pane_pid}").strip()
        subprocess.run(["kill", "-9", pid], check=True)
        with_time = time.monotonic() + PATIENCE_S
        while time.monotonic() < with_time and Path(f"/proc/{pid}").exists():
            time.sleep(0.02)


@pytest.fixture
def terminal(tmp_path: Path) -> Iterator[Terminal]:
    assert shutil.which("tmux"), "this test drives a real terminal and needs tmux"
    found = Terminal(tmp_path / "tmux", tmp_path / "home")
    yield found
    subprocess.run(["tmux", "-S", str(found.socket), "kill-server"], capture_output=True, check=False)


def test_a_circuit_is_added_and_read_and_nothing_accepted_is_lost_when_the_terminal_dies(
    terminal: Terminal, plant: Path
) -> None:
    terminal.open(plant)
    opened = terminal.shows("▸ F1").split("\n")
    assert len(opened) == 25  # 24 lines and what follows the last newline
    assert opened[0].startswith(" Beispielhausen exchange (inv")  # the visit's name goes before the site's last letters

    # To a terminal, Escape with a letter right behind it is another key: so each burst ends before it.
    terminal.keys("a", "c", "Enter", "=T-01", "Enter", "=Test lamp", "Enter")
    terminal.shows("location: ")
    terminal.keys("Escape")
    terminal.shows("▸ T-01")
    terminal.keys("a", "r", "Enter", "=20", "Enter", "=ta", "Enter", "=2.5 mm2", "Enter")
    terminal.shows("material: ")
    terminal.keys("Escape")
    terminal.shows("▸ T-01")
    terminal.keys("a", "l", "Enter", "Enter", "=2", "Enter")
    terminal.shows("power: ")
    terminal.keys("Escape")
    terminal.shows("next: T-01 (m): a round with its current")

    terminal.keys("m")
    terminal.shows("Readings belong to")
    terminal.keys("Enter")
    terminal.shows("Before the first live reading")
    terminal.keys("y")
    terminal.shows("A run 1")
    terminal.keys("=2.02", "Enter", "Enter", "=53.40", "Enter", "=50.1")
    terminal.shows("as typed  ! act")
    terminal.keys("BSpace", "BSpace", "BSpace", "BSpace", "=52.80")
    terminal.shows("52.8 V, computed 52.8")
    terminal.shows("as typed  ✓ sound")
    terminal.keys("Enter")
    terminal.shows("round 1 of T-01 is saved")

    terminal.keys("m", "=2.05", "Enter", "Enter", "=53.4")
    terminal.shows("way: 53.4 V")
    terminal.kill()

    site = site_of(plant)
    circuit = next(circuit for circuit in site.circuits if circuit.tag == "T-01")
    board = next(board for board in site.boards if board.tag == "MDB")
    assert circuit.fed_from == Feed("boards", board.id)
    of_round = {(r.round, r.quantity, r.at): r.value for r in site.readings if r.circuit_id == circuit.id}
    assert of_round == {
        ("1", "current", "run 1"): 2.02,
        ("1", "voltage", "way"): 53.4,
        ("1", "voltage", "p1"): 52.8,
        ("2", "current", "run 1"): 2.05,
    }

    terminal.open(plant)
    terminal.shows("▸ F1")
    terminal.keys("/", "=T-01", "Enter", "Enter")
    terminal.shows("T-01  Test lamp")
    terminal.shows("53.4 V")
    terminal.keys("q")
    last = time.monotonic() + PATIENCE_S
    while time.monotonic() < last and "no server" not in _server(terminal):
        time.sleep(0.05)
    assert "no server" in _server(terminal)


def _server(terminal: Terminal) -> str:
    """What tmux says of its server: gone once the program has left."""
    done = subprocess.run(["tmux", "-S", str(terminal.socket), "ls"], capture_output=True, text=True, check=False)
    return "no server" if done.returncode else done.stdout
