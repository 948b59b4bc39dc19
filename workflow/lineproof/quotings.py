"""How a riskless rate may be quoted, and how a market may be built from the panel: one line each.

A quoting's function takes a rate (decimal, any shape) and the length of its period in years, and gives the period's
return.
"""

from __future__ import annotations

from lineproof.catalog import Entry

QUOTINGS: dict[str, Entry] = {
    "period_return": Entry(
        "lineproof.intake.riskless:period_return", "the return of the period itself"
    ),
    "annual_yield": Entry("lineproof.intake.riskless:annual_yield", "a compound yield a year"),
    "simple_annual_yield": Entry(
        "lineproof.intake.riskless:simple_annual_yield", "a simple yield a year"
    ),
    "discount_91_days": Entry(
        "lineproof.intake.riskless:discount_91_days",
        "the discount of a bill of 91 days, on a year of 360 days",
    ),
}

BUILDS: dict[str, str] = {
    "equal": "the equally weighted mean of all securities",
    "size": "the mean of all securities, weighted by size at the end of the period before",
}
