"""What the schema of a study file cannot see: references, orders, files, options that exclude one another."""

from __future__ import annotations

from typing import Any

from lineproof import demo_files
from lineproof.beta_checks import own_option_findings, shrinkage_findings, size_findings
from lineproof.paper.exhibits import OF_RANKED
from lineproof.schema import Finding, nearest
from lineproof.sort_checks import has_size, sort_findings
from lineproof.source_checks import source_findings
from lineproof.yamlfile import Place, YamlFile


def beta_returns(options: dict[str, Any], content: dict[str, Any]) -> str:
    """The frequency of the returns that an entry under `betas` is estimated from, "monthly" or "daily"."""
    return content["study"]["frequency"] if options["returns"] == "own" else options["returns"]


def _beta_findings(content: dict[str, Any], file: YamlFile) -> list[Finding]:
    found: list[Finding] = []
    for name, options in content["betas"].items():
        place: Place = ("betas", name)
        found += own_option_findings(place, options, file.content["betas"][name] or {})
        if "from" in options:
            found += shrinkage_findings(place, options, file.content["betas"])
            continue
        found += size_findings(place, options, content)
        daily = beta_returns(options, content) == "daily"
        nouns = "trading days" if daily else "months"
        if options["min"] > options["window"]:
            said = f"min {options['min']} is longer than the window of {options['window']} {nouns}"
            found.append(((*place, "min"), said, "lower min or lengthen window"))
        for key in ("window", "min"):
            if daily and key not in file.content["betas"][name]:
                said = f"the key {key!r} is missing"
                found.append((place, said, "betas from daily returns need it, in trading days"))
            elif not daily and options[key] > _MOST_MONTHS:
                said = f"{options[key]} is out of range"
                found.append(((*place, key), said, f"give at most {_MOST_MONTHS} months"))
        if daily and not _has_days(content, "returns"):
            said = "daily returns are asked for, and the study has monthly ones only"
            change = (
                "declare data.returns.frequency: daily if the file has days, or use returns: own"
            )
            found.append(((*place, "returns"), said, change))
        elif daily and not _has_days(content, "market"):
            said = "daily returns are asked for, and the market has monthly ones only"
            found.append(((*place, "returns"), said, "deliver a daily market, or build it"))
    return found


_MOST_MONTHS = 600


def _has_days(content: dict[str, Any], source: str) -> bool:
    """Whether the returns, or the market, are delivered by the day."""
    of_returns = content["data"]["returns"].get("frequency", content["study"]["frequency"])
    return content["data"][source].get("frequency", of_returns) == "daily"


def _frequency_findings(content: dict[str, Any], _: YamlFile) -> list[Finding]:
    if content["study"]["frequency"] != "daily":
        return []
    if "demo" in content:
        said = "the invented market has monthly returns only"
        change = "use frequency: monthly, or leave out the section demo"
        return [(("study", "frequency"), said, change)]
    return [
        (("data", name, "frequency"), "a daily study cannot be made of months", "deliver days")
        for name in ("returns", "market")
        if content["data"][name].get("frequency") == "monthly"
    ]


def _market_findings(content: dict[str, Any], file: YamlFile) -> list[Finding]:
    """A market is read from a file or built from the returns, not both and not neither."""
    place: Place = ("data", "market")
    market, given = content["data"]["market"], file.content["data"]["market"]
    if "build" not in market:
        change = "add it, or build: equal or size to make the market from the returns"
        return [
            (place, f"the key {key!r} is missing", change)
            for key in ("file", "columns")
            if key not in market and "columns" not in market
        ]
    change = "remove it, or remove build"
    found: list[Finding] = [
        ((*place, key), f"a market that is built does not use {key!r}", change)
        for key in given
        if key != "build"
    ]
    if market["build"] == "size" and not has_size(content):
        said = "a market weighted by size needs a size column, and data.returns.columns has none"
        change = "add size under data.returns.columns, or use build: equal"
        found.append(((*place, "build"), said, change))
    return found


def _riskless_findings(content: dict[str, Any], _: YamlFile) -> list[Finding]:
    """Without a riskless rate every return must be in excess of it already."""
    data = content["data"]
    if "riskless" in data:
        return []
    change = "add data.riskless, or set is: excess if they are in excess of it"
    found: list[Finding] = []
    if data["returns"]["is"] == "total":
        found.append((("data", "returns"), "total returns need a riskless rate", change))
    if "build" not in data["market"] and data["market"]["is"] == "total":
        found.append((("data", "market"), "a total return needs a riskless rate", change))
    found += [
        (("portfolios", name), "total returns need a riskless rate", change)
        for name, options in content["portfolios"].items()
        if options["design"] == "supplied" and options["is"] == "total"
    ]
    return found


def _subperiod_findings(content: dict[str, Any], _: YamlFile) -> list[Finding]:
    found: list[Finding] = []
    for name, options in content["subperiods"].items():
        first, last = options["from"], options["to"]
        if first != "first" and last != "last" and first > last:
            said = f"runs backwards, from {first} to {last}"
            found.append((("subperiods", name), said, "swap from and to"))
        if "split" in options and "every" in options:
            found.append((("subperiods", name), "has both split and every", "keep one of the two"))
    return found + _name_findings(content["subperiods"])


def _name_findings(subperiods: dict[str, Any]) -> list[Finding]:
    """Parts of a split that would share a name. Those of `every` depend on the data, and are told when they are cut."""
    found: list[Finding] = []
    owners: dict[str, str] = {}
    for name, options in subperiods.items():
        parts = [f"{name}-{index}" for index in range(1, options.get("split", 0) + 1)]
        for part in parts or [name]:
            if "every" not in options and owners.setdefault(part, name) != name:
                said = f"two subperiods would be called {part}: this one and one of {owners[part]}"
                found.append((("subperiods", name), said, "rename one of them"))
    return found


def _screen_findings(content: dict[str, Any], _: YamlFile) -> list[Finding]:
    known = list(content["data"]["returns"]["columns"])
    return [
        (
            ("intake", "screens", index, "column"),
            f"{screen['column']!r} is not among data.returns.columns",
            nearest(screen["column"], known),
        )
        for index, screen in enumerate(content["intake"]["screens"])
        if screen["column"] not in known
    ]


_MEANT_ONCE = ("security", "date", "return", "size", "price", "final_return", "exit_reason")


def _delisting_findings(content: dict[str, Any], file: YamlFile) -> list[Finding]:
    place: Place = ("intake", "delisting", "by_reason")
    by_reason = content["intake"]["delisting"]["by_reason"]
    found: list[Finding] = []
    if by_reason and "exit_reason" not in content["data"]["returns"]["columns"]:
        said = (
            "final returns by reason need a column exit_reason, and data.returns.columns has none"
        )
        found.append(
            (place, said, "add exit_reason under data.returns.columns, or remove by_reason")
        )
    for code in by_reason:
        if (*place, str(code)) not in file.lines:  # as 007, which YAML takes for 7
            said = f"a code that YAML takes for {code!r} is not what is written"
            found.append((place, said, "put it in quotes"))
    return found


def _paper_findings(content: dict[str, Any], _: YamlFile) -> list[Finding]:
    paper = content["paper"]
    found: list[Finding] = [
        (
            ("paper", key),
            f"{paper[key]!r} is not declared under {among}",
            nearest(paper[key], list(content[among])),
        )
        for key, among in (("main", "portfolios"), ("main_subperiod", "subperiods"))
        if paper.get(key) is not None and paper[key] not in content[among]
    ]
    return found or _of_ranked_findings(paper, content["portfolios"])


def _of_ranked_findings(paper: dict[str, Any], portfolios: dict[str, Any]) -> list[Finding]:
    """Tables or figures of ranked groups alone, where no test assets that they show are ranked."""
    main = paper.get("main") or next(iter(portfolios))
    shown = {"tables": list(portfolios), "figures": [main]}
    return [
        (
            ("paper", key),
            "only what shows ranked groups, and these test assets are supplied",
            "add one that shows supplied test assets, or write default",
        )
        for key, sorts in shown.items()
        if set() < set(paper[key]) <= OF_RANKED
        if all(portfolios[sort]["design"] == "supplied" for sort in sorts)
    ]


_OURS = (
    *("security", "date", "return", "size", "price", "final_return", "exit_reason"),
    *("rate", "asset"),
)


def _column_findings(content: dict[str, Any], _: YamlFile) -> list[Finding]:
    """Prices that returns are to be computed from; and two of our names for one column of a file.

    Names of the user's own, for screens, may share one.
    """
    mapped = {("data", name): options for name, options in content["data"].items()}
    mapped |= {("portfolios", name): options for name, options in content["portfolios"].items()}
    found: list[Finding] = []
    columns = content["data"]["returns"]["columns"]
    is_wide = content["data"]["returns"]["layout"] == "wide"
    if isinstance(columns.get("return"), dict) and "price" not in columns and not is_wide:
        said = "returns from prices need a price column, and there is none"
        change = "add price under data.returns.columns"
        found.append((("data", "returns", "columns", "return"), said, change))
    for place, options in mapped.items():
        taken: dict[str, str] = {}
        for name, column in options.get("columns", {}).items():
            if name not in _OURS or not isinstance(column, str):
                continue
            if taken.setdefault(column, name) != name:
                said = f"{column!r} is the column of {taken[column]!r} already"
                change = "one column cannot be both: change one of the two"
                found.append(((*place, "columns", name), said, change))
    return found


def _demo_findings(content: dict[str, Any], _: YamlFile) -> list[Finding]:
    """A span that runs backwards, or is too short for a market of several eras."""
    demo = content.get("demo")
    if demo is None:
        return []
    first, last = demo["first"], demo["last"]
    months = _count(last) - _count(first) + 1
    if months < 1:
        said, change = f"runs backwards, from {first} to {last}", "swap first and last"
    elif months < demo_files.SHORTEST:
        said = f"{first} to {last} is {months} months"
        change = f"give a span of at least {demo_files.SHORTEST} months"
    else:
        return []
    return [(("demo",), said, change)]


def _count(month: str) -> int:
    year, number = month.split("-")
    return 12 * int(year) + int(number)


# What the schema cannot see; a check runs when the sections it reads are sound.
CHECKS = (
    ({"betas", "study", "data"}, _beta_findings),
    ({"study", "demo", "data"}, _frequency_findings),
    ({"portfolios", "betas", "data"}, sort_findings),
    ({"data"}, _market_findings),
    ({"data", "portfolios"}, _riskless_findings),
    ({"subperiods"}, _subperiod_findings),
    ({"data", "portfolios"}, _column_findings),
    ({"intake", "data"}, _screen_findings),
    ({"intake", "data"}, _delisting_findings),
    ({"demo"}, _demo_findings),
    ({"paper", "portfolios", "subperiods"}, _paper_findings),
    ({"study", "demo", "data", "portfolios"}, source_findings),
)
