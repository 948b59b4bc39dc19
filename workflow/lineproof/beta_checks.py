"""What the schema cannot see of an entry under `betas`: whose its options are, and what they refer to."""

from __future__ import annotations

from typing import Any

from lineproof.estimators import OWN_OPTIONS
from lineproof.schema import Finding, nearest
from lineproof.yamlfile import Place

_ROLLING = ("estimator", "returns", "window", "min")
_SHRINKING = ("shrink", "weight", "to")


def own_option_findings(
    place: Place, options: dict[str, Any], given: dict[str, Any]
) -> list[Finding]:
    """Options that belong to another estimator, and those that this one cannot do without."""
    method = options.get("shrink", "") if "from" in options else options["estimator"]
    own = OWN_OPTIONS.get(method, {})
    kind = "shrinkage" if "from" in options else "estimator"
    found: list[Finding] = [
        (place, f"the key {key!r} is missing", f"{kind} {method} needs it")
        for key, is_needed in own.items()
        if is_needed and key not in options
    ]
    others = {key for keys in OWN_OPTIONS.values() for key in keys} - set(own)
    for key in given:
        if key in others and not (key in _SHRINKING and "from" not in options):
            said = f"{kind} {method or 'none'} does not use {key!r}"
            found.append(((*place, key), said, f"remove it, or change the {kind}"))
    if "from" not in options:
        found += [
            ((*place, key), f"{key!r} is for shrinking another entry", "remove it, or add from:")
            for key in _SHRINKING
            if key in given
        ]
    return found


def shrinkage_findings(
    place: Place, options: dict[str, Any], betas: dict[str, Any]
) -> list[Finding]:
    """An entry that shrinks another: the other must be there, and estimated itself."""
    found: list[Finding] = [
        ((*place, key), f"an entry with from does not use {key!r}", "remove it, or remove from")
        for key in _ROLLING
        if key in betas[place[1]]
    ]
    if "shrink" not in options:
        found.append((place, "the key 'shrink' is missing", "add it: cross_section or fixed"))
    rolled = [name for name, other in betas.items() if "from" not in (other or {})]
    if options["from"] not in betas:
        said = f"{options['from']!r} is not declared under betas"
        found.append(((*place, "from"), said, nearest(options["from"], rolled)))
    elif options["from"] not in rolled:
        said = f"{options['from']!r} is shrunk itself"
        found.append(((*place, "from"), said, "name the entry that it is made from"))
    return found


def size_findings(place: Place, options: dict[str, Any], content: dict[str, Any]) -> list[Finding]:
    """Windows too short for what is estimated, and factors that are not declared or not as frequent."""
    found: list[Finding] = []
    estimator = options["estimator"]
    n_factors = 1
    if estimator == "lagged":
        n_factors = options["lags"] + options["leads"] + 1
    elif estimator == "multi_factor":
        n_factors = 1 + len(options.get("factors", ()))
        found += _factor_findings(place, options, content)
    if options["min"] < n_factors + 2:
        said = f"min {options['min']} is too few for a standard error with {n_factors} slopes"
        found.append(((*place, "min"), said, f"give at least {n_factors + 2}"))
    if estimator == "correlation_volatility":
        short, fewest = options.get("volatility_window"), options.get("volatility_min")
        if short is not None and fewest is not None and fewest > short:
            said = f"volatility_min {fewest} is longer than the volatility_window of {short}"
            change = "lower volatility_min or lengthen volatility_window"
            found.append(((*place, "volatility_min"), said, change))
        if short is not None and options["overlap"] > short:
            said = f"overlap {options['overlap']} is longer than the volatility_window of {short}"
            found.append(((*place, "overlap"), said, "sum over fewer periods"))
        if short is not None and short > options["window"]:
            said = f"volatility_window {short} is longer than the window of {options['window']}"
            found.append(((*place, "volatility_window"), said, "shorten it, or lengthen window"))
    return found


def _factor_findings(
    place: Place, options: dict[str, Any], content: dict[str, Any]
) -> list[Finding]:
    data = content["data"]
    if "factors" not in data:
        return [((*place, "factors"), "there is no data.factors", "add the file of the factors")]
    known = [name for name in data["factors"]["columns"] if name != "date"]
    found: list[Finding] = [
        ((*place, "factors"), f"{name!r} is not among data.factors.columns", nearest(name, known))
        for name in options.get("factors", ())
        if name not in known
    ]
    study = content["study"]["frequency"]
    delivered = data["returns"].get("frequency", study)
    of_factors = data["factors"].get("frequency", delivered)
    of_returns = study if options["returns"] == "own" else options["returns"]
    if of_factors != of_returns:
        said = f"{of_returns} returns are asked for, and data.factors has {of_factors} ones"
        found.append(((*place, "returns"), said, "deliver factors as frequent as the returns"))
    return found
