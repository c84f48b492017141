"""SV02: only a part of the site's terminations was read, and how many bad ones may be among the rest."""

from collections.abc import Iterator

from rules.assessment import Citation, Finding, NotJudged, Severity
from rules.calc.sampling import most_bad
from rules.coverage import Coverage, coverage_of
from rules.record import Figure
from rules.rule import SiteCase, rule
from rules.units import show


@rule(
    id="SV02",
    title="Part of the terminations not read",
    about="site",
    severity=Severity.NOTE,
    remedy="Read the others, those that carry most current and serve people's safety first; then the bound falls.",
    caution="The bound holds for a part drawn at random. What could not be reached, or may not be switched, is no random part: "
    "it may be worse. Nothing here says that an unread termination is good.",
    source=Citation(
        "C. J. Clopper, E. S. Pearson, Biometrika 26, 404", "1934", "for a finite number: hypergeometric", "computed"
    ),
    also=(Citation("J. A. Hanley, A. Lippman-Hand, JAMA 249, 1743", "1983", "rule of three", "from-memory"),),
    limits=("decision", "sampling", "heat", "termination"),
)
def share_tested(case: SiteCase) -> Iterator[Finding | NotJudged]:
    """
    Of all terminations of the site's runs, four a run, some lie in runs between two points that were read under load, where
    the readings say anything. With so many read and so many bad connections found among them, claimed by the diagnosis or
    read hot, up to so many of the others may be bad, at the profile's confidence: exact, for a part drawn at random. Without a
    bad one it is near 3 / read of all.

    **Finds**: 30 of 100 terminations read, none found bad: up to 8 of the other 70.

    **Leaves alone**: a site all of whose runs were read.
    """
    if not case.context.site.readings:
        return
    found = coverage_of(case.context)
    total, read, bad = found.joints, found.joints_read, found.bad
    if read == total:
        return
    if not read:
        yield share_tested.gap(case, "site", "no run lies between two points that were read under load")
        return
    confidence = case.context.limits["sampling.confidence"]
    more = most_bad(total, read, bad, confidence) - bad
    share, left = read / total, total - read
    yield share_tested.finding(
        case,
        "site",
        f"{read} of {total} terminations, {show(share, '1', digits=2)}, lie in runs between two points that were read under load; "
        f"{_circuits_words(found)}; "
        f"{_found_words(bad)}; of the other {left} up to {more} may be bad, at {show(confidence, '1')} "
        "confidence and if those read were drawn at random",
        numbers={
            "share_read": Figure(share, "1"),
            "others_bad_at_most": Figure(more / left, "1"),
            "confidence": Figure(confidence, "1"),
        },
        source=f"{share_tested.source}; {case.context.limits.citation('sampling')}",
    )


def _circuits_words(found: Coverage) -> str:
    """Circuits on which something was read, and on how many of them such runs are."""
    read = f"{found.circuits_read} of {found.circuits} circuits were read"
    return read if found.circuits_between == found.circuits_read else f"{read}, {found.circuits_between} of them so"


def _found_words(bad: int) -> str:
    if not bad:
        return "no bad connection was found among them"
    return f"{bad} bad connection{'s were' if bad > 1 else ' was'} found among them"
