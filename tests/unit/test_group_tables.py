"""Tables of ranked groups, and of groups by two variables: what stands where, and what it is called."""

from __future__ import annotations

import re

import pytest
from tests.unit import paper_examples as examples

from lineproof.paper import html_table, layout
from lineproof.paper.context import Context
from lineproof.paper.exhibits import OF_RANKED, figures, tables
from lineproof.paper.specification import Panel
from lineproof.paper.symbols import Phrase, said
from lineproof.paper.tables import build

GROUPS = "ten/-/formations/-"


def text(phrase: Phrase) -> str:
    return re.sub("<[^>]*>", "", html_table.phrase(phrase))


def addresses(panel: Panel, row: str) -> dict[str, str]:
    """Address of each cell of a row that is not empty, by column."""
    (found,) = (each for each in panel.rows if each.key == row)
    named = zip(panel.columns, found.cells, strict=True)
    return {column.key: cell.address for column, cell in named if cell.address}


@pytest.mark.parametrize(
    ("asset", "label"),
    [
        ("p01", "Low"),
        ("p02", "2"),
        ("p10", "High"),
        ("spread", "High − low"),
    ],
)
def test_groups_of_one_variable_are_called_low_to_high(asset: str, label: str) -> None:
    assert examples.double().label("ten", asset) == label


@pytest.mark.parametrize(
    ("asset", "label"),
    [("p01-04", "1 / 4"), ("p03-01", "3 / 1"), ("spread-02", "High − low")],
)
def test_groups_of_two_variables_are_called_by_both(asset: str, label: str) -> None:
    assert examples.double().label("double", asset) == label


def test_supplied_assets_keep_their_names() -> None:
    context = examples.study(
        {"given": ({"title": "Given", "design": "supplied"}, ["p01", "p02-03", "Low"])},
        [examples.subperiod("full", "1990-01", "1999-12")],
    )
    assert [context.label("given", name) for name in context.assets("given")] == [
        *("p01", "p02-03", "Low"),
    ]


def test_a_row_of_groups_at_formation() -> None:
    table = build(examples.usual())["groups_at_formation"]
    errors = examples.usual().facts["paper"]["alpha_errors"]
    assert addresses(table.panels[0], "p03") == {
        "n_members": f"{GROUPS}/p03/n_members/-",
        "min_members": f"{GROUPS}/p03/min_members/-",
        "max_members": f"{GROUPS}/p03/max_members/-",
        "mean_size": f"{GROUPS}/p03/mean_size/-",
        "ante_beta": f"{GROUPS}/p03/ante_beta/-",
        "beta": f"ten/full/time_series/market/p03/beta/{errors}",
        "turnover": f"{GROUPS}/p03/turnover/-",
        "exit_share": f"{GROUPS}/p03/exit_share/-",
    }
    assert [text(row.labels[0]) for row in table.panels[0].rows][::9] == ["Low", "High"]
    assert "Means over 20 formations." in map(text, table.notes)


def test_a_row_of_moves_adds_up() -> None:
    (panel,) = build(examples.usual())["group_moves"].panels
    assert [text(column.heading) for column in panel.columns] == [
        *("Low", *map(str, range(2, 10)), "High", "Out")
    ]
    assert addresses(panel, "p03")["p04"] == "ten/-/transitions/-/p03/p04/-"
    assert addresses(panel, "p03")["out"] == "ten/-/transitions/-/p03/out/-"
    assert "out" not in addresses(panel, "new")
    for row in panel.rows:
        shares = [cell.value for cell in row.cells if cell.value is not None]
        assert sum(shares) == pytest.approx(1, abs=1e-14)  # eleven shares, rounded once each


def test_many_groups_are_cut_into_panels() -> None:
    panels = build(examples.many())["group_moves"].panels
    assert [len(panel.columns) for panel in panels] == [9, 9, 8]
    assert [text(panel.title) for panel in panels] == [
        "Panel A: to Low to 9",
        "Panel B: to 10 to 18",
        "Panel C: to 19 to Out",
    ]
    keys = [column.key for panel in panels for column in panel.columns]
    assert keys == [*examples.groups(25), "out"]


def test_ranked_groups_of_two_variables_are_grids() -> None:
    table = build(examples.double())["ranked_portfolios"]
    assert sum(len(panel.columns) for panel in table.panels) == 9 * 5 + 4  # no members of a spread
    first = table.panels[0]
    assert text(first.stubs[0]) == "Size"
    assert text(first.columns[0].spanner) == "Mean excess return, by beta"
    assert [text(column.heading) for column in first.columns[:5]] == [
        *("Low", "2", "3", "High", "High − low"),
    ]
    assert [text(row.labels[0]) for row in first.rows] == ["Low", "2", "High", "Mean"]
    assert addresses(first, "02")["mean:04"] == "double/full/describe/-/p02-04/mean/-"
    assert addresses(first, "02")["mean:spread"] == "double/full/describe/-/spread-02/mean/-"
    assert addresses(first, "mean") == {
        "mean:spread": "double/full/describe/-/spread/mean/-",
        "sd:spread": "double/full/describe/-/spread/sd/-",
    }


@pytest.mark.parametrize("name", ["ranked_portfolios", "groups_at_formation", "group_moves"])
def test_every_group_has_its_place_in_each_grid(name: str) -> None:
    """The group an address is about is the one that row and column say."""
    for panel in build(examples.double())[name].panels:
        for row in panel.rows:
            for column, address in addresses(panel, row.key).items():
                inner = column.split(":")[1]
                if inner != "spread":
                    assert address.split("/")[4] == f"p{row.key}-{inner}"


def test_a_spread_has_a_row_of_its_own_below_the_groups() -> None:
    panel = build(examples.double())["ranked_portfolios-ten"].panels[0]
    assert [row.key for row in panel.rows[-3:]] == ["p10", "spread", "market"]
    assert addresses(panel, "spread")["t_alpha"] == "ten/full/time_series/market/spread/alpha/hac"


def test_alphas_of_two_variables_stay_together_by_the_first() -> None:
    table = build(examples.double())["alphas_betas"]
    heads = [[column.key for column in panel.columns] for panel in table.panels]
    inside = [[*(f"p{n:02d}-{m:02d}" for m in range(1, 5)), f"spread-{n:02d}"] for n in (1, 2, 3)]
    assert heads == [inside[0] + inside[1], [*inside[2], "spread"]]
    assert text(table.panels[0].columns[0].spanner) == "Size: Low"
    assert text(table.panels[-1].columns[-1].spanner) == "Mean"
    assert text(table.panels[-1].title).endswith("size High, by beta")


def test_spreads_are_in_no_joint_test_and_on_no_line() -> None:
    for name in ("joint_tests", "market_line"):
        table = build(examples.double())[name]
        sizes = {
            cell.value
            for panel, _, column, cell in table.cells()
            if (panel.key, column.key) == ("double", "assets") and cell.value is not None
        }
        assert sizes == {12}
        assert "Differences of groups are no test assets here." in map(text, table.notes)


def test_what_stays_of_groups_by_two_variables() -> None:
    panels = build(examples.double())["group_moves"].panels
    assert [len(panel.columns) for panel in panels] == [8, 8]
    found = {
        key: address
        for panel in panels
        for key, address in addresses(panel, "02").items()
        if key.endswith(":03")
    }
    moves = "double/-/transitions/-/p02-03"
    assert found == {
        "same:03": f"{moves}/p02-03/-",
        "same_first:03": f"{moves}/same_first/-",
        "same_second:03": f"{moves}/same_second/-",
        "out:03": f"{moves}/out/-",
    }


@pytest.mark.parametrize("make", [examples.hostile, examples.usual])
def test_supplied_assets_have_no_table_or_figure_of_groups(make: object) -> None:
    context: Context = make()
    for exhibit in (*tables(context.facts), *figures(context.facts)):
        assert exhibit.name not in OF_RANKED or context.ranked(exhibit.sort)
    shown = {exhibit.name for exhibit in tables(context.facts)}
    assert bool(shown & OF_RANKED) == (make is examples.usual)


@pytest.mark.parametrize(("place", "letters"), [(0, "A"), (25, "Z"), (26, "AA"), (701, "ZZ")])
def test_letters_of_panels(place: int, letters: str) -> None:
    assert text(layout.lettered(place, said("x"))) == f"Panel {letters}: x"
