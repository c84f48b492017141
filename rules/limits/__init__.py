"""Limits profiles: ``limits.of(site)`` is the one place where a site's limits are resolved."""

from rules.limits.profile import LimitGroup, Limits, RuleSetting, names, of

__all__ = ["LimitGroup", "Limits", "RuleSetting", "names", "of"]
