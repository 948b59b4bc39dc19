"""An invented market, the Kestrel Sound Exchange, with its true parameters.

The raw files carry the blemishes of real deliveries; the truth tables say what a careful reader
should find. Nothing here reads or writes a file.
"""

from __future__ import annotations

import numpy as np
import pandas as pd

from lineproof.demo.eras import era_table
from lineproof.demo.faults import choose_places, plant_faults
from lineproof.demo.files import (
    RETURN_COLUMNS,
    market_text,
    return_lines,
    riskless_text,
    sector_text,
    security_rows,
)
from lineproof.demo.securities import draw_panel
from lineproof.demo.series import draw_market
from lineproof.demo_files import SHORTEST

SMALLEST, LARGEST = 40, 40_000

__all__ = ["make_demo"]


def make_demo(
    *, n_securities: int, first: str, last: str, seed: int
) -> dict[str, str | pd.DataFrame]:
    """Make the demo market of `n_securities` over the months `first` to `last` (YYYY-MM).

    Excess returns follow the zero-beta market model (Black 1972) with betas that wander slowly,
    residual risk that rises with beta, and heavy tails. The price of beta differs by era: about
    the market premium, then nearly nothing, then little beside a high intercept, then less than
    nothing; the market's own premium is positive throughout. By design of the demo the market's
    mean shock within an era is nearly removed, so that every sample tells these stories.

    Returns texts of raw files and frames of truth:

    - returns.csv: security, date, ret, final_ret, exit_code, price, size, sector; decimal
      returns, sizes in millions, final_ret on top of ret in a leaver's last row.
    - market.csv: month, total_return (percent a month).
    - riskless.csv: month, annual_yield (percent).
    - sector_indices.csv: asset, month, ret (percent a month).
    - truth_eras: era, first, last, intercept, slope, premium (decimal a month, in excess of the
      riskless rate).
    - truth_betas: security, date, beta, residual_sd (decimal a month), one row a listed month.
    - truth_faults: fault, kind, line, security, date, raw: what is wrong in returns.csv.

    The same arguments give the same bytes. Raises ValueError for markets too small or too
    large to make, or months that cannot be read.
    """
    months = pd.period_range(pd.Period(first, "M"), pd.Period(last, "M"), freq="M")
    if not SMALLEST <= n_securities <= LARGEST:
        raise ValueError(f"n_securities must be {SMALLEST} to {LARGEST}, not {n_securities}")
    if len(months) < SHORTEST:
        raise ValueError(f"{first} to {last} is {len(months)} months; at least {SHORTEST} needed")
    # A stream for each part: changing how faults are planted leaves the market as it is.
    for_market, for_securities, for_rows, for_faults = (
        np.random.Generator(np.random.PCG64(part)) for part in np.random.SeedSequence(seed).spawn(4)
    )
    series = draw_market(for_market, months)
    panel = draw_panel(for_securities, series, n_securities)
    rows = security_rows(for_rows, panel, series)
    lines, truth_faults = plant_faults(return_lines(rows), rows, choose_places(for_faults, rows))
    return {
        "returns.csv": "\n".join([",".join(RETURN_COLUMNS), *lines]) + "\n",
        "market.csv": market_text(series),
        "riskless.csv": riskless_text(series),
        "sector_indices.csv": sector_text(panel, series),
        "truth_eras": era_table(months),
        "truth_betas": rows[["security", "date", "beta", "residual_sd"]],
        "truth_faults": truth_faults,
    }
