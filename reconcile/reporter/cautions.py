"""The cautions of every report, in one place: page, terminal, workbook and JSON all read them here."""

from __future__ import annotations

CAUTIONS: tuple[str, ...] = (
    "A flag is a lead for the quality unit, not a disposition.",
    "No finding is not a release: silence means only that no fault larger than the smallest detectable one was seen.",
    "The original reading stands. Compare it with the original entry; it is never amended from a report.",
    "A candidate substance is a ranking of what would explain the readings, not an identification of what is in the "
    "bottle.",
    "A finding is consistent with the readings it names; its rivals are what the same readings cannot tell from it.",
    "A prediction is a calculation, not a preparation instruction.",
    "A next check is a reading of what already stands, and only where the quality unit authorises it. Nothing is to be "
    "mixed, acidified or prepared again because of this report.",
    "Follow site procedure, safety data sheets, local rules and licensed practice.",
)
SHORT_CAUTION = "A flag is a lead for the quality unit, not a disposition; no finding is not a release."
NO_HAZARD_WORD = "no hazard word recorded here; see the safety data sheet"
UNSIGNED = (
    "This manifest is unsigned. It is neither an audit trail nor an electronic signature; it lets anyone see whether "
    "a file has changed since it was written."
)
FORMULA_NOTE = (
    "In the CSV files a text field that a spreadsheet could take for a formula (one that begins with =, +, - or @) "
    "carries an apostrophe in front. In every file, control characters, line breaks and invisible characters of the "
    "record's text are written as their code points, such as \\u001b. Nothing else in a text is changed."
)
ROUNDING_NOTE = (
    "Everything is computed unrounded and rounded once, for show: halves away from zero, observed pH with the decimals "
    "of its own display. The CSV files carry six significant digits."
)


def gas_words(gas: str) -> str:
    """What is said beside a stock that gives off a gas with acid; "" when none is recorded."""
    return f"gives off {gas} with acid" if gas else ""
