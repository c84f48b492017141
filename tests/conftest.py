"""Shared by all tests."""

from collections.abc import Iterator

import pytest

from rules import rule


@pytest.fixture(autouse=True, scope="session")
def faults_of_rules_surface() -> Iterator[None]:
    """A rule that fails by a fault of its own fails the test, while people get it as a gap and the other rules go on."""

    def surface(error: Exception) -> str:
        raise error

    with pytest.MonkeyPatch.context() as patch:
        patch.setattr(rule, "fault_words", surface)
        yield
