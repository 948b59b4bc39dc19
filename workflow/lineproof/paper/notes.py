"""Notes to tables: sentences made from the study's own facts, so that they cannot contradict it."""

from __future__ import annotations

from lineproof.analyses import ALPHA_ERRORS, ANALYSES, LINE_ERRORS, LINE_WEIGHTS
from lineproof.paper.context import Context, Subperiod
from lineproof.paper.rounding import share
from lineproof.paper.symbols import Phrase, said
from lineproof.quotings import BUILDS


def data(context: Context) -> Phrase:
    """Which market, and whether it exists."""
    invented = ", an invented market" if context.facts["invented"] else ""
    return said(
        "{adjective} returns on {market}{invented}.",
        adjective=context.period.adjective.capitalize(),
        market=_market(context),
        invented=invented,
    )


def built_market(context: Context) -> list[Phrase]:
    """What the market is, where it was not supplied."""
    build = context.facts["market_build"]
    return [] if build is None else [said("The market is {label}.", label=BUILDS[build])]


def months(period: Subperiod) -> Phrase:
    """The months a table covers."""
    return said("{dates}.", dates=period.dates)


def formation(context: Context, sort: str) -> Phrase:
    """How test assets are made."""
    facts = context.facts["sorts"][sort]
    if not context.ranked(sort):
        return said("{title}: test assets supplied as return series.", title=facts["title"])
    return said(
        "{title}: {formation}; returns are {weights}.",
        title=facts["title"],
        formation=facts["formation"],
        weights=facts["weights_label"],
    )


def low_and_high(context: Context, sort: str) -> list[Phrase]:
    """What the names of a sort's groups mean."""
    if not context.ranked(sort):
        return []
    names = context.variables(sort)
    return [said("Low and High: lowest and highest {variables}.", variables=" or ".join(names))]


def groups(context: Context, sort: str) -> list[Phrase]:
    """What the names of a sort's groups, and of the differences between them, mean."""
    found = low_and_high(context, sort)
    if context.spreads(sort):
        outer, *inner = context.variables(sort)
        within = f" inside each {outer} group; Mean: of all {outer} groups" if inner else ""
        found.append(
            said(
                "High − low: the return of the highest {of} group less that of the lowest{within}.",
                of=(inner or [outer])[0],
                within=within,
            )
        )
    return found


def prior_betas(context: Context, sort: str) -> Phrase:
    """Of which betas the ex-ante betas are the means."""
    return said(
        "Prior {beta}: mean by weight of the members’ betas, those {which}.",
        which=context.facts["sorts"][sort]["prior_betas"],
    )


def formations(context: Context, sorts: list[str]) -> list[Phrase]:
    """How several sets of test assets are made, without saying twice what they share."""
    found: list[Phrase] = []
    said_of: dict[str, str] = {}
    for sort in sorts:
        facts = context.facts["sorts"][sort]
        shared = facts.get("formation")
        if context.ranked(sort) and shared in said_of:
            found.append(
                said(
                    "{title}: as {first}, but returns are {weights}.",
                    title=facts["title"],
                    first=said_of[shared],
                    weights=facts["weights_label"],
                )
            )
            continue
        if shared is not None:
            said_of[shared] = facts["title"]
        found.append(formation(context, sort))
    return found


def excess_units(context: Context) -> Phrase:
    """Units of returns."""
    return said(
        "Returns are in excess of the riskless rate, in per cent a {noun}.",
        noun=context.period.noun,
    )


def alpha_errors(context: Context) -> Phrase:
    """Which standard errors the t statistics of alphas rest on."""
    kind = context.facts["paper"]["alpha_errors"]
    lag = _lag(context) if kind == "hac" else Phrase()
    return said(
        "{t} statistics of {alpha} rest on standard errors that are {label}{lag}.",
        label=ALPHA_ERRORS[kind],
        lag=lag,
    )


def line_estimation(context: Context) -> Phrase:
    """How the market line is fitted, and its standard errors."""
    paper = context.facts["paper"]
    return said(
        "Mean excess returns of the test assets on their betas of the same {periods}, by {weights}: "
        "intercept "
        "{gamma0}, slope {gamma1}. Standard errors: {errors}{lag}.",
        weights=LINE_WEIGHTS[paper["line_weights"]],
        periods=context.period.nouns,
        errors=line_errors(context),
        lag=line_lag(context),
    )


def line_errors(context: Context) -> str:
    """What the market line's standard errors are."""
    return LINE_ERRORS[context.facts["paper"]["line_errors"]].format(period=context.period)


def line_lag(context: Context) -> Phrase:
    """The lag of the market line's standard errors, where they have one."""
    has_lag = context.facts["paper"]["line_errors"].endswith("_hac")
    return _lag(context) if has_lag else Phrase()


def line_hypothesis(context: Context) -> Phrase:
    """What the market line is held against."""
    return said(
        "By the CAPM {gamma0} is zero and {gamma1} is {fbar}, the market’s mean excess return. "
        "Critical values "
        "are two-sided at the {level}{percent} level; joint {p} is of both hypotheses together{law}.",
        level=share(context.level),
        law=_joint_law(context.facts["paper"]["line_errors"]),
    )


def _joint_law(kind: str) -> Phrase:
    """Which law the joint p value is taken from."""
    laws = {
        "textbook": said(", by {F} with 2 and {N} − 2 degrees of freedom"),
        "monthly_slopes": said(", by {F} with 2 and {T} − 2 degrees of freedom"),
    }
    return laws.get(kind, said(", by {chi2} with 2 degrees of freedom"))


def joint_hypothesis(context: Context) -> Phrase:
    """What the joint tests test, and when each is exact."""
    return said(
        "Each tests that the alphas of all {N} test assets are zero in {T} {periods}. {F} is exact "
        "if residuals are "
        "normal (Gibbons, Ross and Shanken 1989); the others are {chi2} with {N} degrees of "
        "freedom in large "
        "samples, the corrected likelihood ratio after Jobson and Korkie (1982), the last robust "
        "to "
        "heteroskedasticity and autocorrelation (Hansen 1982){lag}. {p} values in square brackets.",
        periods=context.period.nouns,
        lag=_lag(context),
    )


def not_run(analysis: str) -> Phrase:
    """Why a table has no rows."""
    return said("The study file does not ask for {label}.", label=ANALYSES[analysis].label)


def without_assets(context: Context, sort: str, periods: list[Subperiod]) -> list[Phrase]:
    """Subperiods in which a sort has no test asset, so that a table has no row for them."""
    gone = [each.title for each in periods if not context.book.assets(sort, each.name)]
    if not gone or len(gone) == len(periods):
        return []
    return [
        said(
            "{title}: no test asset has a return in {gone}.",
            title=context.title(sort),
            gone="; ".join(gone),
        )
    ]


def _lag(context: Context) -> Phrase:
    lag = context.facts["hac_lag"]
    return said(", lag {auto_lag}") if lag is None else said(", lag {lag}", lag=str(lag))


def _market(context: Context) -> str:
    return context.facts["market_name"]
