"""Dates of another form than the study file declares: more than faults of single rows."""

from __future__ import annotations

from pathlib import Path

import pandas as pd
import pytest
from tests.unit.intake_examples import UNUSABLE, kept, lines, refused, validate

DAYS = pd.bdate_range("2000-01-03", periods=60)


def rows(form: str, n: int = 60) -> str:
    return lines(*(f"S{k},{day:{form}},0.01,,1,5" for k, day in enumerate(DAYS[:n])))


@pytest.mark.fault(9)
def test_days_and_months_swapped(tmp_path: Path) -> None:
    """Those up to the 12th of a month parse, as other days."""
    n_late = int((DAYS.day > 12).sum())
    said = refused(tmp_path, rows("%m/%d/%Y"), dates="%d/%m/%Y")
    assert said == (
        f"{UNUSABLE}  raw/returns.csv, column day: {n_late} of 60 dates are not of the form %d/%m/%Y, "
        "as '01/13/2000'\n"
        '    → set dates: "%m/%d/%Y"'
    )


def test_no_date_fits_and_the_form_is_in_doubt(tmp_path: Path) -> None:
    said = refused(tmp_path, rows("Q%m-%d-%Y"), dates="%Y%m%d")
    assert "60 of 60 dates are not of the form %Y%m%d, as 'Q01-03-2000'\n" in said
    assert said.endswith("→ set dates: as the file writes them, or leave it out to have it found")


@pytest.mark.fault(8)
def test_dates_of_single_rows_are_set_aside(tmp_path: Path) -> None:
    """Twelve of sixty are a fifth, and blank dates are no other form."""
    text = rows("%Y-%m-%d")
    for k, day in enumerate(DAYS[:24]):
        text = text.replace(f"S{k},{day:%Y-%m-%d}", f"S{k},{'never' if k < 12 else ''}")
    assert len(kept(validate(tmp_path, text))) == 36
    said = refused(tmp_path, text.replace(f"{DAYS[24]:%Y-%m-%d}", "never"))
    assert "13 of 60 dates are not of the form %Y-%m-%d, as 'never'" in said


def test_a_handful_of_rows_is_not_judged(tmp_path: Path) -> None:
    text = rows("%Y-%m-%d", 29).replace("2000-01-", "January ")
    assert len(kept(validate(tmp_path, text))) < 29
