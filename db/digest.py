"""The digest of a save: finds a value that was flipped in the file, since SQLite keeps no sums of its pages."""

from __future__ import annotations

import hashlib
from collections.abc import Iterable
from typing import NamedTuple

from db.rows import to_json


class SaveRow(NamedTuple):
    """A row of ``saves`` without its digest."""

    id: str
    stamp: int
    who: str
    laptop: str
    why: str
    undoes: str | None
    """The save that this one undid, or ``None``."""


def digest(save: SaveRow, changes: Iterable[tuple[str, str, str | None, str]]) -> str:
    """
    Digest of a save with its changes.

    Parameters
    ----------
    save
        The save itself.
    changes
        Its rows of ``changes`` as table, row, values, saw, sorted by table and row.

    Returns
    -------
    str
        BLAKE2b of 128 bits, in hexadecimal.
    """
    total = hashlib.blake2b(to_json(save).encode(), digest_size=16)
    # JSON holds no bare control codes, so these two cannot occur within a part.
    for table, row, values, saw in changes:
        total.update(f"\x1e{table}\x1f{row}\x1f{'' if values is None else values}\x1f{saw}".encode())
    return total.hexdigest()
