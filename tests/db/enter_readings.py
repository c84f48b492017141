"""
A surveyor without rest: saves one reading after the other and prints each once it is saved.

    python enter_readings.py SITE WHO [COUNT]

Printed are the readings' values, counted up; run as a child process by the tests, which kill it.
"""

from __future__ import annotations

import sys
from itertools import count, islice

from db.store import SiteStore
from rules.record import Reading


def main(path: str, who: str, most: str = "1000000") -> None:
    """Save readings with the values 0, 1, 2 … until the end comes."""
    with SiteStore(path, laptop=who) as store:
        for value in islice(count(), int(most)):
            with store.save(who, f"reading {value}") as save:
                save.add(
                    "readings",
                    Reading(id="", circuit_id="c1", round=who, quantity="voltage", at="way", value=float(value)),
                )
            print(value, flush=True)


if __name__ == "__main__":
    main(*sys.argv[1:])
