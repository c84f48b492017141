"""Which check tells what is behind a common error."""

from __future__ import annotations

import math

import numpy as np
import pytest
from scipy import integrate, stats

from rules import limits
from rules.diagnosis.common_error import CommonError, Explanation
from rules.diagnosis.habits import Habit
from rules.diagnosis.telling import information, most_telling, noise_of
from rules.record import Figure, Site

GENERAL = limits.of(Site(name="x"))


def explanation(kind: str, probability: float, size: float, of: str = "X", unit: str = "1") -> Explanation:
    specified = 0.003 if kind in ("voltage", "current", "resistance") else 0.0
    return Explanation(Habit(kind, of), probability, probability, Figure(size, unit, abs(size) / 10), specified)


def error(*explanations: Explanation) -> CommonError:
    return CommonError(
        40, Figure(0.06, "1", 0.005), explanations, 0.0, 1 - sum(one.probability for one in explanations)
    )


@pytest.mark.parametrize(
    ("probability", "size", "u", "noise"),
    [(0.5, 0.06, 0.005, 0.03), (0.2, -0.1, 0.02, 0.08), (0.9, 15.0, 3.0, 8.0), (0.5, 0.5, 0.01, 0.001)],
)
def test_information_is_the_mutual_information(probability: float, size: float, u: float, noise: float) -> None:
    """Against scipy: entropy of what is shown less that which remains once it is known whether the habit errs."""
    parts = [(probability, stats.norm(size, math.hypot(u, noise))), (1 - probability, stats.norm(0, noise))]

    def of(shown: float) -> float:
        both = sum(share * law.pdf(shown) for share, law in parts)
        told = sum(
            share * law.pdf(shown) * math.log2(law.pdf(shown) / both) for share, law in parts if law.pdf(shown) > 1e-200
        )
        return float(told)

    reach = 9 * math.hypot(u, noise)
    total, _ = integrate.quad(of, min(0, size) - reach, max(0, size) + reach, points=[0, size], limit=400, epsabs=1e-9)
    assert information(probability, size, u, noise) == pytest.approx(total, abs=1e-6)


@pytest.mark.parametrize("probability", [0.02, 0.3, 0.5, 0.97, 1.0])
def test_a_sharp_look_tells_the_whole_entropy(probability: float) -> None:
    shares = [share for share in (probability, 1 - probability) if share > 0]
    entropy = -sum(share * math.log2(share) for share in shares)
    assert information(probability, 0.06, 0.001, 1e-5) == pytest.approx(entropy, abs=1e-6)


def test_it_never_tells_more_than_the_entropy_nor_less_than_nothing() -> None:
    for noise in np.geomspace(1e-6, 10, 25).tolist():
        assert 0 <= information(0.4, 0.06, 0.01, noise) <= 0.971


def test_of_a_voltmeter_and_a_clamp_the_check_is_a_second_meter() -> None:
    check = most_telling(error(explanation("voltage", 0.55, 0.06), explanation("current", 0.44, 0.06)), GENERAL)
    assert check.words == "Read one of these circuits with another voltmeter on the same clips as voltmeter X."
    assert check.repeated == 1
    assert check.bits == pytest.approx(0.993, abs=0.002)


def test_the_most_probable_is_not_checked_where_another_tells_more() -> None:
    """One taped length has the 8 % of each paced one; a second clamp settles half of the doubt by itself."""
    paced = explanation("length", 0.5, 0.15, "paced")
    check = most_telling(error(paced, explanation("current", 0.4, 0.15, "CL-1")), GENERAL)
    assert check.words.startswith("Put another clamp around the same conductor as clamp CL-1")
    alone = most_telling(error(paced), GENERAL)
    assert alone.words == "Tape 3 of the paced lengths."
    assert alone.repeated == math.ceil((3 * math.hypot(0.08, 0.01) / 0.15) ** 2)


def test_what_is_hardly_probable_is_not_checked() -> None:
    check = most_telling(error(explanation("length", 0.992, 0.15, "paced"), explanation("zero", 0.005, 3.0)), GENERAL)
    assert check.explanation.habit.kind == "length"


@pytest.mark.parametrize(
    ("kind", "of", "size", "words"),
    [
        ("zero", "CL-1", 0.3, "Read the zero of clamp CL-1 with its jaws closed around nothing, away from any conductor."),
        ("temperature", "assumed", 24.8, "Read the conductor's temperature with a probe in one of these circuits: assumed conductor temperatures."),  # noqa: E501
        ("cable", "2.5 mm2 copper stranded", 0.1, "Read the resistance of a taped length of cable 2.5 mm² copper stranded, isolated."),
        ("resistance", "MO-1", 0.1, "Read one of these circuits with another ohmmeter at the same places as ohmmeter MO-1."),
        ("length", "tape", 0.1, "Tape one of the taped lengths."),
    ],
)  # fmt: skip
def test_every_habit_has_its_check(kind: str, of: str, size: float, words: str) -> None:
    assert most_telling(error(explanation(kind, 0.95, size, of)), GENERAL).words == words


def test_two_meters_of_one_accuracy_make_the_noise() -> None:
    assert noise_of(explanation("voltage", 0.5, 0.06), GENERAL) == pytest.approx(0.003 * math.sqrt(2))
