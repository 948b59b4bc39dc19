"""What the numbers say, in sentences: for each subperiod and over all."""

from __future__ import annotations

from collections import Counter
from itertools import pairwise

from lineproof.paper import notes
from lineproof.paper.book import Number
from lineproof.paper.context import Context, Subperiod
from lineproof.paper.rounding import share
from lineproof.paper.specification import cell
from lineproof.paper.symbols import SYMBOLS, Phrase, joined, said

WRONG_SIGN = "higher beta went with lower returns"
PRICED = "beta is priced, and its price cannot be told from the market’s premium"
PRICED_BELOW = "beta is priced, but below the market’s premium"
PRICED_ABOVE = "beta is priced, and above the market’s premium"
UNPRICED = "no price of beta is found, and the slope is below the market’s premium"
UNPRICED_ABOVE = "no price of beta is found, though the slope is above the market’s premium"
UNDECIDED = "the slope can be told neither from zero nor from the market’s premium"

_READINGS = {
    (1, 0): PRICED,
    (1, -1): PRICED_BELOW,
    (1, 1): PRICED_ABOVE,
    (0, 0): UNDECIDED,
    (0, -1): UNPRICED,
    (0, 1): UNPRICED_ABOVE,
}
_WORDS = (
    "none", "one", "two", "three", "four", "five", "six", "seven", "eight", "nine", "ten",
    "eleven", "twelve", "thirteen", "fourteen", "fifteen", "sixteen", "seventeen", "eighteen",
    "nineteen", "twenty",
)  # fmt: skip


def reading(slope: Number, difference: Number, level: float) -> str:
    """The line in words: its slope, and the slope less the market's mean, each against zero."""
    of_slope, of_difference = _sign(slope, level), _sign(difference, level)
    return WRONG_SIGN if of_slope < 0 else _READINGS[of_slope, of_difference]


def _sign(number: Number, level: float) -> int:
    """1 or -1 for a number above or below zero at the level, else 0."""
    if not number.rejects(level):
        return 0
    return 1 if number.estimate > 0 else -1


def of_period(context: Context, period: Subperiod) -> Phrase:
    """What the market line and the joint test of the main test assets say in one subperiod."""
    return joined([_line_sentence(context, period), _joint_sentence(context, period)], " ")


def overall(context: Context) -> Phrase:
    """The answer for the main subperiod, and how the other subperiods compare."""
    main = context.main_period
    others = [each for each in context.periods if each.name != main.name]
    sentences = [_headline(context, main), _joint_sentence(context, main)]
    sentences += _spread(context, others)
    sentences += _rejections(context, others)
    return joined(sentences, " ")


def _headline(context: Context, period: Subperiod) -> Phrase:
    numbers = _line(context, period)
    if numbers is None or not numbers[0].defined:
        return said("{title}: the market line gives no answer.", title=period.title)
    slope, difference = numbers
    return said(
        "{title}: {reading}. The line’s slope is {slope}{percent} a {noun} ({t}{equals}{slope_t}){premium}.",
        title=period.title,
        noun=context.period.noun,
        reading=reading(slope, difference, context.level),
        slope=cell(slope, context.period.mean_format),
        slope_t=cell(slope, "number", "statistic"),
        premium=_premium(context, period),
    )


def _premium(context: Context, period: Subperiod) -> Phrase:
    sort = context.sorts[0]
    market = context.book.at(sort, period.name, "market_line", "-", "all", "market_mean", "-")
    return said(
        ", against a mean market premium of {premium}{percent}",
        premium=cell(market, context.period.mean_format),
    )


def _line_sentence(context: Context, period: Subperiod) -> Phrase:
    numbers = _line(context, period)
    if numbers is None:
        return said("The market line is not reported.")
    slope, difference = numbers
    if not slope.defined:
        return said("The market line is not defined: {reason}.", reason=slope.reason)
    return said(
        "The line’s slope is {slope}{percent} a {noun} ({t}{equals}{slope_t}){premium}: {reading}. The difference of "
        "{difference}{percent} has a standard error of {se}{percent} ({errors}{lag}), "
        "{t}{equals}{statistic}.",
        noun=context.period.noun,
        slope=cell(slope, context.period.mean_format),
        slope_t=cell(slope, "number", "statistic"),
        premium=_premium(context, period),
        reading=reading(slope, difference, context.level),
        difference=cell(difference, context.period.mean_format),
        se=cell(difference, context.period.mean_format, "se"),
        errors=notes.line_errors(context),
        lag=notes.line_lag(context),
        statistic=cell(difference, "number", "statistic"),
    )


def _joint_sentence(context: Context, period: Subperiod) -> Phrase:
    joint = _joint(context, period)
    if joint is None:
        return said("The joint test is not reported.")
    if not joint.defined:
        return said("The joint test is not defined: {reason}.", reason=joint.reason)
    value = cell(joint, "p", "p")
    verdict = "is rejected" if joint.rejects(context.level) else "is not rejected"
    return said(
        "That every alpha is zero {verdict} at the {level}{percent} level "
        "({F}{equals}{statistic}, {p}{relation}{value}).",
        verdict=verdict,
        level=share(context.level),
        statistic=cell(joint, "number", "statistic"),
        relation="\N{NO-BREAK SPACE}" if value.text.startswith("<") else SYMBOLS["equals"],
        value=value,
    )


def _spread(context: Context, others: list[Subperiod]) -> list[Phrase]:
    """How many of the other subperiods say what."""
    lines = _lines(context, others)
    if not lines:
        return []
    counts = Counter(reading(*each, context.level) for each in lines)
    listed = "; ".join(f"in {_word(count)}, {words}" for words, count in counts.most_common())
    overlap = ", some of which overlap" if _overlap(others) else ""
    of = "the other subperiod" if len(lines) == 1 else f"the {_word(len(lines))} other subperiods"
    return [said("Of {of}{overlap}: {listed}.", of=of, overlap=overlap, listed=listed)]


def _rejections(context: Context, others: list[Subperiod]) -> list[Phrase]:
    """In how many of the other subperiods the joint test rejects."""
    joint = [_joint(context, each) for each in others]
    defined = [each for each in joint if each is not None and each.defined]
    if not defined:
        return []
    rejected = sum(each.rejects(context.level) for each in defined)
    among = "" if len(defined) == len(joint) else f", defined in {_word(len(defined))} of them,"
    return [
        said("The joint test{among} rejects in {count}.", among=among, count=_word(rejected)),
    ]


def _line(context: Context, period: Subperiod) -> tuple[Number, Number] | None:
    """Slope, and slope less the market's mean premium; None where the line is not reported."""
    sort, paper = context.sorts[0], context.facts["paper"]
    if not context.book.ran(sort, period.name, "market_line"):
        return None
    slope, difference = (
        context.book.at(
            *(sort, period.name, "market_line", paper["line_weights"]),
            *("all", term, paper["line_errors"]),
        )
        for term in ("slope", "slope_minus_market")
    )
    return slope, difference


def _lines(context: Context, periods: list[Subperiod]) -> list[tuple[Number, Number]]:
    found = (_line(context, each) for each in periods)
    return [each for each in found if each is not None and each[0].defined]


def _joint(context: Context, period: Subperiod) -> Number | None:
    sort = context.sorts[0]
    if not context.book.ran(sort, period.name, "joint_alpha"):
        return None
    return context.book.at(sort, period.name, "joint_alpha", "f", "all", "alpha", "-")


def _overlap(periods: list[Subperiod]) -> bool:
    ordered = sorted(periods, key=lambda each: each.first)
    return any(later.first <= earlier.last for earlier, later in pairwise(ordered))


def _word(count: int) -> str:
    return _WORDS[count] if count < len(_WORDS) else str(count)
