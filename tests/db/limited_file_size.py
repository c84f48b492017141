"""
Saves, or makes a site file, under a limit on file sizes, until there is no space.

    python limited_file_size.py BYTES save|create SITE

Prints the error's text and how many readings were saved; ends with the error's exit status.
"""

from __future__ import annotations

import resource
import sys

from db.errors import SiteError
from db.store import SiteStore
from rules.record import Reading


def main(size: int, what: str, path: str) -> int:
    """Do it and return the exit status."""
    resource.setrlimit(resource.RLIMIT_FSIZE, (size, size))
    saved = 0
    try:
        with SiteStore(path, read_only=what == "create") as store:
            if what == "create":
                SiteStore.create(f"{path}.new.ohmwalk", store.site(), "ann", "lap", "new").close()
            while what == "save":
                new = [
                    Reading(id="", circuit_id="c1", round="full", quantity="voltage", at="way", value=float(value))
                    for value in range(saved, saved + 20)
                ]
                with store.save("ann", "bundle") as save:
                    save.add_all("readings", new)
                saved += len(new)
    except SiteError as error:
        print(error)
        print(saved)
        return error.exit_status
    return 0


if __name__ == "__main__":
    sys.exit(main(int(sys.argv[1]), *sys.argv[2:]))
