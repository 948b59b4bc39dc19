"""How the dates of raw data are written: as the study file says or, where it does not, as the data show."""

from __future__ import annotations

from typing import Any

from lineproof.intake.date_order import DateOrder
from lineproof.intake.reading import open_files
from lineproof.intake.values import check_date_format

ISO = "%Y-%m-%d"


def with_dates(
    files: str | list[str], reading: dict[str, Any], *, daily: bool = False
) -> dict[str, Any]:
    """The options for reading, with the format of the dates in them; `daily` data must give a day.

    Where the study file leaves it open, the files are read once for their dates alone. Raises KnownProblem when the
    format is none, or the data leave a doubt.
    """
    if reading.get("dates") is None:
        order = DateOrder()
        alone = reading if reading.get("layout") == "wide" else _dates_alone(reading)
        for file in open_files(files, {**alone, "dates": ISO}):
            for block in file.blocks():
                order.add(block.columns["date"])
        reading = {**reading, "dates": order.found(reading) or ISO}
    check_date_format(reading, daily=daily)
    return reading


def _dates_alone(reading: dict[str, Any]) -> dict[str, Any]:
    return {**reading, "columns": {"date": reading["columns"]["date"]}}
