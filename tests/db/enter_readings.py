"""
A surveyor without rest: saves one reading after the other and prints each once it is saved.

    python enter_readings.py SITE WHO [COUNT]

Printed are the readings' values, counted up; run as a child process by the tests, which kill it.
"""

from __future__ import annotations

import sys
from itertools import count, islice

from db.errors import SiteLocked
from db.store import SiteStore
from rules.record import Reading


def main(path: str, who: str, most: str = "1000000") -> None:
    """Save readings with the values 0, 1, 2 … until the end comes."""
    with SiteStore(path, laptop=who) as store:
        for value in islice(count(), int(most)):
            while not is_saved(store, who, value):
                pass
            print(value, flush=True)


def is_saved(store: SiteStore, who: str, value: int) -> bool:
    """Save a reading; false where another program held the file for five seconds, and the value is to be entered again."""
    reading = Reading(id="", circuit_id="c1", round=who, quantity="voltage", at="way", value=float(value))
    try:
        with store.save(who, f"reading {value}") as save:
            save.add("readings", reading)
    except SiteLocked:
        return False
    return True


if __name__ == "__main__":
    main(*sys.argv[1:])
