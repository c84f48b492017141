"""Names joined to the place of a finding so that two places never read alike."""

from __future__ import annotations


def joined(*names: str) -> str:
    """
    Names with commas between them; one that holds such a comma itself is put in quotes.

    Examples
    --------
    >>> joined("p1", "lamp"), joined("p1, lamp"), joined("p1, lamp", "fan")
    ('p1, lamp', '"p1, lamp"', '"p1, lamp", fan')
    """
    return ", ".join(_whole(name) for name in names if name)


def _whole(name: str) -> str:
    if ", " not in name and not name.startswith('"'):
        return name
    return '"' + name.replace('"', '""') + '"'
