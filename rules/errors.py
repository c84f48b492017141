"""
The errors of ``rules``.

RulesError
├── InvalidQuantity   a number that cannot be (a negative length, not finite, a wrong dimension)
├── UnreadableText    people's text that is no quantity or can be read two ways
├── UnknownSize       a conductor size that no table has
├── MissingData       something needed is not recorded: the rule is not judged, the others go on
└── ProfileError      a limits profile that does not hold together
"""

from __future__ import annotations


class RulesError(Exception):
    """Base of all errors that ``rules`` raises on purpose; its text is fit for a user."""


class InvalidQuantity(RulesError):
    """A number that cannot be."""


class UnreadableText(RulesError):
    """Text that is not a quantity, or that can be read two ways."""


class UnknownSize(RulesError):
    """A conductor size that no table has."""


class MissingData(RulesError):
    """Something that a rule needs is not known; not known is neither zero nor a pass."""


class ProfileError(RulesError):
    """A limits profile that does not hold together."""
