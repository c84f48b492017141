"""IN03: a meter was used where its category or its rated voltage is too low."""

from collections.abc import Iterator

from rules.assessment import Citation, Finding, NotJudged, Severity
from rules.index import Index
from rules.meters import instrument_row
from rules.ratings import Rating, asked_of, highest_v, rank, ratings_of, words
from rules.record import Figure
from rules.rule import SiteCase, rule
from rules.taken import Taken, some, taken
from rules.units import show_against


@rule(
    id="IN03",
    title="Meter category or rated voltage too low for the place",
    about="site",
    severity=Severity.SOON,
    remedy="Do not use this meter there again; take one, with leads, of the category asked for, rated above the highest voltage.",
    caution="A meter that is overstressed can burst in the hand. The category counts more than the volts, and the leads have one of "
    "their own. Batteries and d.c. rails are not mains: what a category promises there is for the meter's maker to say.",
    source=Citation("IEC 61010-2-033", "2019", "measurement categories of hand-held meters", "from-memory"),
    also=(Citation("IEC 61010-2-032", "2019", "measurement categories of clamps", "from-memory"),),
)
def meter_category_too_low(case: SiteCase) -> Iterator[Finding | NotJudged]:
    """
    A meter was used where its category or its voltage is too low. The board or source, or a circuit of it, asks for a higher
    category than the meter has, or its sources reach more volts than the meter is rated for: as recorded, else at work, else
    nominal.

    **Finds**: CAT II 600 V on a board of CAT III; CAT III 30 V on a source that reaches 56.4 V.

    **Leaves alone**: a rating of exactly the highest voltage; thermometers and dead tests of a resistance.
    """
    index = case.context.index
    wrong: dict[tuple[str, str], tuple[str, dict[str, Figure], list[str]]] = {}
    ratings: dict[str, tuple[Rating, ...]] = {}
    unrated: list[str] = []
    unasked: list[str] = []
    for place in taken(case.context):
        on, category = asked_of(place.place, index)
        if on is None:
            continue
        if not category:
            unasked.append(on.tag)
        highest = highest_v(place.place, index)
        for meter in _meters(place, index):
            if meter not in ratings:
                ratings[meter] = _ratings(meter, index)
            found = _judged(ratings[meter], category, highest)
            if found is None:
                unrated.append(meter)
            elif found[0]:
                wrong.setdefault((meter, on.tag), (*found, []))[2].append(place.place.tag)
    for (meter, board), (why, numbers, tags) in wrong.items():
        yield meter_category_too_low.finding(
            case, f"{meter} on {board}", f"{meter} {why}; used on {some(tags)}", numbers=numbers
        )
    if unrated:
        yield meter_category_too_low.gap(case, "meters", f"category or rated voltage is not recorded: {some(unrated)}")
    if unasked:
        yield meter_category_too_low.gap(case, "places", f"what category they ask for is not recorded: {some(unasked)}")


def _meters(place: Taken, index: Index) -> list[str]:
    """The recorded meters that were connected to, or clamped around, what was live."""
    used = [row for row in place.readings if row.quantity not in ("resistance", "temperature")]
    return list(dict.fromkeys(row.instrument for row in used if instrument_row(row, index) is not None))


def _ratings(meter: str, index: Index) -> tuple[Rating, ...]:
    """Of whichever of its ranges they are recorded for: they are the meter's."""
    return tuple(dict.fromkeys(each for row in index.ranges_of(meter) for each in ratings_of(row)))


def _judged(ratings: tuple[Rating, ...], asked: str, highest: float | None) -> tuple[str, dict[str, Figure]] | None:
    """What stands against a meter, empty where nothing does; ``None`` where too little is recorded to say."""
    enough = [each for each in ratings if each.rank >= rank(asked)]
    known = [each for each in ratings if each.category]
    category_fails = bool(asked and known and not enough)
    if not enough and not category_fails:
        return None
    volts = max((each.voltage_v for each in enough or known if each.voltage_v is not None), default=None)
    if volts is None or highest is None or volts >= highest:
        if category_fails:
            return f"is {words(known)}, where {asked} is asked for", {}
        return None if volts is None else ("", {})
    rated, reached = show_against(volts, highest, "V")
    numbers = {"rated": Figure(volts, "V"), "highest": Figure(highest, "V")}
    if category_fails:
        return f"is {words(known)}, where {asked} is asked for and the voltage reaches {reached}", numbers
    if known and all(each.printed_v != volts for each in enough):
        return f"is {words(known)}, where the voltage reaches {reached}", numbers
    return f"is rated {rated}{f' in {asked}' if asked else ''} where the voltage reaches {reached}", numbers
