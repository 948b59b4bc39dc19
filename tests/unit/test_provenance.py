"""Which code a rule depends on."""

from __future__ import annotations

from lineproof.provenance import PACKAGE, WORKFLOW, code_of


def names(rule: str) -> set[str]:
    return {
        str(path.relative_to(WORKFLOW)) for path in code_of(WORKFLOW / "scripts" / f"{rule}.py")
    }


def test_a_rule_depends_on_its_script_and_what_that_imports() -> None:
    found = names("estimate_betas")
    assert {
        "scripts/estimate_betas.py",
        "lineproof/estimation.py",
        "lineproof/__init__.py",
    } <= found


def test_registry_entries_are_followed() -> None:
    """`estimation` imports no estimator; it loads the one that the registry names."""
    assert {"lineproof/stats/betas.py", "lineproof/stats/windows.py"} <= names("estimate_betas")
    assert "lineproof/stats/market_line.py" in names("price_subperiod")


def test_numbers_do_not_depend_on_the_paper_nor_betas_on_pricing() -> None:
    for rule in (
        "validate_returns",
        "estimate_betas",
        "form_portfolios",
        "cut_subperiods",
        "price_subperiod",
    ):
        assert not any(name.startswith("lineproof/paper") for name in names(rule)), rule
    assert "lineproof/stats/market_line.py" not in names("estimate_betas")
    assert "lineproof/stats/windows.py" not in names("price_subperiod")


def test_no_number_depends_on_the_reading_of_the_study_file() -> None:
    """An edit there may not re-run a study: the options themselves are compared."""
    for rule in ("validate_returns", "estimate_betas", "form_portfolios", "price_subperiod"):
        assert not {"lineproof/study.py", "lineproof/specs.py"} & names(rule), rule


def test_templates_count_as_code() -> None:
    templates = {str(p.relative_to(WORKFLOW)) for p in (PACKAGE / "paper" / "templates").iterdir()}
    assert templates
    assert templates <= names("write_report")
