"""How betas are estimated, in words."""

from __future__ import annotations

from typing import Any

from lineproof.estimators import ESTIMATORS, SHRINKAGES
from lineproof.frequency import FREQUENCIES
from lineproof.specs import BetaSpec


def window_in_words(betas: BetaSpec) -> str:
    """The window and everything that the estimate depends on: `60 months (ordinary least squares; …)`."""
    periods = FREQUENCIES[betas.returns].counted
    how = [
        ", ".join([ESTIMATORS[betas.estimator].label, *_own(betas, periods)]),
        f"at least {betas.min_obs} {periods}"
        + (" of falling markets" if betas.estimator == "downside" else ""),
    ]
    if betas.shrunk:
        how.append(_shrinkage(betas.shrunk))
    return f"{betas.window} {periods} ({'; '.join(how)})"


def _own(betas: BetaSpec, periods: str) -> list[str]:
    """What the options of one estimator alone say."""
    own = betas.own
    match betas.estimator:
        case "multi_factor":
            return [f"which are {_listed(list(betas.factors))}"]
        case "lagged":
            return [f"{_counted(own['lags'], 'lag')} and {_counted(own['leads'], 'lead')}"]
        case "exponential":
            return [f"half-life {own['half_life']:g} {periods}"]
        case "correlation_volatility":
            summed = f"returns summed over {own['overlap']}" if own["overlap"] > 1 else "returns"
            return [
                f"the correlation of {summed}",
                f"volatilities over {own['volatility_window']} {periods} with at least "
                f"{own['volatility_min_obs']}",
            ]
        case "downside":
            return [f"those below {_LEVELS[own['below']]}"]
    return []


_LEVELS = {"mean": "the market’s mean in the window", "zero": "zero"}


def _shrinkage(shrunk: dict[str, Any]) -> str:
    label, own = SHRINKAGES[shrunk["shrink"]].label, shrunk["own"]
    if shrunk["shrink"] == "fixed":
        return f"{label}, {own['to']:g}, with weight {own['weight']:g} on the estimate"
    return label


def _counted(n: int, noun: str) -> str:
    return f"{n or 'no'} {noun}{'' if n == 1 else 's'}"


def _listed(names: list[str]) -> str:
    *others, last = names
    return f"{', '.join(others)} and {last}" if others else last
