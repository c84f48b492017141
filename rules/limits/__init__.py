"""Limits profiles: ``limits.of(site)`` is the one place where a site's limits are resolved."""

from rules.limits.group import LimitGroup, Limits, RuleSetting, Stated
from rules.limits.profile import ROOT, names, of

__all__ = ["ROOT", "LimitGroup", "Limits", "RuleSetting", "Stated", "names", "of"]
