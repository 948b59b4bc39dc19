"""The securities of the demo market: listings, true betas, returns, sizes and prices."""

from __future__ import annotations

from dataclasses import dataclass

import numpy as np

from lineproof.demo.eras import by_month
from lineproof.demo.series import MarketSeries, heavy_tailed, mean_reverting

# Sector and how far its securities' betas lie from the market's on average.
SECTORS: dict[str, float] = {
    "energy": 0.05,
    "materials": 0.15,
    "machinery": 0.20,
    "household": -0.30,
    "retail": 0.00,
    "health": -0.20,
    "financials": 0.10,
    "technology": 0.45,
    "utilities": -0.50,
    "transport": 0.10,
}
LISTED_AT_START = 0.45
MEAN_LIFE = 0.9  # in lengths of the sample
SHORTEST_LIFE = 6
DIVIDEND = 0.0025
SIZE_REVERSION = 0.02
LOWEST_RETURN = -0.95
SPLIT_ABOVE, CONSOLIDATE_BELOW = 120.0, 2.0
PENNY_SHARE = 1 / 40


@dataclass(frozen=True)
class Traits:
    """What a security keeps for life; each an array (n_securities,).

    `size` is its usual size in millions in prices of the first month; `price` is where its price
    starts; `risk` multiplies its residual standard deviation; `quote` multiplies its price.
    """

    sector: np.ndarray
    beta: np.ndarray
    size: np.ndarray
    price: np.ndarray
    risk: np.ndarray
    quote: np.ndarray


@dataclass(frozen=True)
class Panel:
    """Everything that is true about the securities; arrays (n_months, n_securities).

    Returns, betas and standard deviations are decimal a month, sizes in millions at month end,
    and `weight` is the share of a security in the market: its size at the end of the month
    before, zero in the first month of a newcomer. Entries where `listed` is false mean nothing.
    """

    traits: Traits
    listed: np.ndarray
    beta: np.ndarray
    residual_sd: np.ndarray
    ret: np.ndarray
    weight: np.ndarray
    size: np.ndarray
    price: np.ndarray


def draw_listings(rng: np.random.Generator, n_months: int, n_securities: int) -> np.ndarray:
    """Which months each security is listed: bool (n_months, n_securities), one spell each.

    One founder a sector stays throughout, so that no sector index has a gap. Nobody leaves in
    the last month: a reader could not tell it from the end of the data.
    """
    n_start = round(LISTED_AT_START * n_securities)
    entry = np.zeros(n_securities, dtype=int)
    latest = n_months - SHORTEST_LIFE
    entry[n_start:] = np.sort(rng.integers(1, latest + 1, n_securities - n_start))
    life = SHORTEST_LIFE + np.floor(rng.exponential(MEAN_LIFE * n_months, n_securities))
    leaves = entry + life
    leaves[leaves >= n_months] = n_months
    leaves[: len(SECTORS)] = n_months
    month = np.arange(n_months)[:, None]
    return (month >= entry) & (month < leaves)


def draw_traits(rng: np.random.Generator, n_securities: int) -> Traits:
    """Draw lasting traits; smaller securities have somewhat higher betas and lower prices.

    The smallest are penny shares, quoted below one all their life as no other is: a screen on
    price takes whole securities, not the months in which a price has just fallen, which would
    bias the returns that are left.
    """
    n_sectors = len(SECTORS)
    sector = rng.integers(0, n_sectors, n_securities)
    sector[:n_sectors] = np.arange(n_sectors)
    own = rng.standard_normal((4, n_securities))
    log_size = np.log(30.0) + 1.2 * own[1] - 0.3 * own[0]
    penny = log_size <= np.quantile(log_size, PENNY_SHARE)
    return Traits(
        sector=sector,
        beta=1.0 + np.array(list(SECTORS.values()))[sector] + 0.4 * own[0],
        size=np.exp(log_size),
        price=np.exp(np.log(18.0) + 0.3 * own[1] + 0.6 * own[2]),
        risk=np.exp(0.15 * own[3]),
        quote=np.where(penny, 0.6 / SPLIT_ABOVE, 1.0),
    )


def draw_panel(rng: np.random.Generator, series: MarketSeries, n_securities: int) -> Panel:
    """Simulate all securities, month by month because sizes set the next month's weights.

    Each month the betas are centred so that their weighted mean is one, and the residuals are
    made to have a weighted sum of zero, so the weighted mean of the returns is the market
    return exactly.
    """
    shape = (len(series.months), n_securities)
    listed, traits = draw_listings(rng, *shape), draw_traits(rng, n_securities)
    raw_beta = traits.beta + mean_reverting(rng, shape, persistence=0.985, sd=0.2)
    shock = heavy_tailed(rng, shape)
    usual = np.cumprod(1.0 + series.market - DIVIDEND)[:, None] * traits.size
    intercept = by_month("intercept", shape[0])
    beta, sd, ret, weight, size, price = np.zeros((6, *shape))
    for t in range(shape[0]):
        old = listed[t - 1] if t else listed[0]
        size_before = np.where(old, size[t - 1] if t else traits.size, usual[t])
        price_before = np.where(old, price[t - 1] if t else traits.price, traits.price)
        held = size_before * (old & listed[t])
        weight[t] = held / held.sum()
        beta[t] = raw_beta[t] + 1.0 - weight[t] @ raw_beta[t]
        line = zero_beta_line(beta[t], series.market[t], series.riskless[t], intercept[t])
        own_sd = traits.risk * (0.045 + 0.035 * np.abs(beta[t]))
        residual = np.maximum(own_sd * shock[t], LOWEST_RETURN - line)
        residual, sd[t] = offset_residuals(residual, own_sd, weight[t])
        ret[t] = line + residual
        growth = 1.0 + ret[t] - DIVIDEND
        size[t] = next_size(size_before * growth, usual[t])
        price[t] = next_price(price_before * growth)
    return Panel(traits, listed, beta, sd, ret, weight, size, price * traits.quote)


def zero_beta_line(
    beta: np.ndarray, market: float, riskless: float, intercept: float
) -> np.ndarray:
    """Returns of one month without residuals, decimal: the zero-beta CAPM (Black 1972).

    With a market premium of intercept + slope, the line intercept + slope b and the response
    b (f - premium) to the market's excess return f add up to intercept (1 - b) + b f.
    """
    return riskless + intercept * (1.0 - beta) + beta * (market - riskless)


def offset_residuals(
    residual: np.ndarray, sd: np.ndarray, weight: np.ndarray
) -> tuple[np.ndarray, np.ndarray]:
    """Make the residuals' weighted sum zero; return them with their new standard deviations.

    Each loses its linear projection on the weighted sum, the smallest change that does it: a
    security gives way in proportion to weight times variance, so small ones hardly move.
    """
    share = weight * sd**2
    total = weight @ share
    kept = residual - share * (weight @ residual) / total
    return kept, np.sqrt(sd**2 - share**2 / total)


def next_size(size: np.ndarray, usual: np.ndarray) -> np.ndarray:
    """Size after issues and buy-backs that pull it towards its usual one, to the nearest 0.001."""
    return np.maximum(np.round(size * (usual / size) ** SIZE_REVERSION, 3), 0.001)


def next_price(price: np.ndarray) -> np.ndarray:
    """Price after splits: two for one when dear, one for ten when very cheap."""
    split = np.where(price > SPLIT_ABOVE, 0.5, 1.0)
    return price * np.where(price < CONSOLIDATE_BELOW, 10.0, split)
