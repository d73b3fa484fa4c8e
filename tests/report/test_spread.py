"""How firm the answer is: the sentence first, the picture, the table; hand-made rows."""

from __future__ import annotations

import xml.etree.ElementTree as ET
from dataclasses import replace

import pytest

from normalize.days import day_of_iso
from normalize.report import spread
from normalize.report.figure_spread import MOST_ROWS, spread_figure
from normalize.report.html import to_html
from normalize.report.json import to_dict
from normalize.report.numbers import NBSP
from normalize.report.text import to_text
from normalize.savings.results import Estimate
from normalize.sensitivity import Moved
from normalize.site import SiteResult

NONE = Estimate.none("not asked")
SVG = "{http://www.w3.org/2000/svg}"
BILL = (day_of_iso("2022-01-05"), day_of_iso("2022-02-04"))


def estimate(value: float, low: float, high: float, over: float = 842.4) -> Estimate:
    return Estimate(
        value, low, high, value / over, low / over, high / over, low, high, method="made by hand"
    )


def row(changes: str, name: str, e: Estimate, **more: object) -> Moved:
    return Moved("gas", name, changes, e, NONE, **more)  # type: ignore[arg-type]


def with_rows(result: SiteResult, *rows: Moved) -> SiteResult:
    own = result.accounts[0].savings.normalized
    first = Moved("gas", "the station, ten years", "as chosen", own, NONE, form_before="heating")
    return replace(result, moved=(first, *rows))


def bill(number: int, e: Estimate, start: int = BILL[0]) -> Moved:
    return row(
        "one bill left out", f"without bill {number}", e, number=number, side="before",
        start=start, end=start + 30,
    )  # fmt: skip


FIRM = (
    row("same form", "flat on both sides", estimate(300.0, -500.0, 900.0), far="fits far worse"),
    row("weights", "every bill counts alike", estimate(101.0, 60.0, 150.0)),
    bill(3, estimate(160.0, 120.0, 200.0)),
    bill(4, estimate(177.0, 130.0, 220.0), day_of_iso("2022-02-04")),
)


def said(result: SiteResult) -> str:
    return " ".join(spread.sentences(result.accounts[0], result)).replace(NBSP, " ")


def test_a_firm_saving_is_said_with_its_values_and_ranges(gas_house_result: SiteResult) -> None:
    """101 and 177 of 842.4 are 12.0 and 21.0 %; 60 and 220 are 7.1 and 26 %."""
    text = said(with_rows(gas_house_result, *FIRM))
    assert text == (
        "Whatever is changed below, the saving stays between 12 % and 21 % and can be told from "
        "no change (the ranges lie between 7.1 % and 26 %)."
    )


def test_a_form_that_fits_far_worse_turns_nothing(gas_house_result: SiteResult) -> None:
    assert "turn" not in said(with_rows(gas_house_result, *FIRM))


def test_the_one_bill_that_turns_the_answer_is_named(gas_house_result: SiteResult) -> None:
    text = said(with_rows(gas_house_result, *FIRM, bill(7, estimate(60.0, -5.0, 130.0))))
    assert "Leaving out the bill of January 2022 alone would turn it into" in text
    assert "“could not be told from no change”" in text


def test_several_that_turn_it_are_counted_and_three_are_named(gas_house_result: SiteResult) -> None:
    turned = [bill(n, estimate(60.0, -5.0, 130.0), BILL[0] + 30 * n) for n in range(10, 15)]
    text = said(with_rows(gas_house_result, *FIRM, *turned))
    assert "5 of 8 changes, each alone, would turn it into" in text
    assert text.count("leaving out") == 3
    assert "and 2 more" in text


def test_what_cannot_be_told_says_directions(gas_house_result: SiteResult) -> None:
    own = Estimate(-10.0, -60.0, 40.0, -0.01, -0.06, 0.04, -60.0, 40.0)
    first = Moved("gas", "the station", "as chosen", own, NONE)
    other = row("weights", "every bill counts alike", estimate(20.0, -30.0, 70.0, 1000.0))
    result = replace(gas_house_result, moved=(first, other))
    assert said(result) == (
        "Whatever is changed below, the change could not be told from none; it stays between "
        "1.0 % more and 2.0 % less."
    )


def test_avoided_use_speaks_where_the_normal_year_is_not_known(
    gas_house_result: SiteResult,
) -> None:
    known = estimate(50.0, 20.0, 80.0)
    first = Moved("gas", "the station", "as chosen", NONE, known)
    other = Moved("gas", "every bill counts alike", "weights", NONE, estimate(55.0, 25.0, 90.0))
    result = replace(gas_house_result, moved=(first, other))
    assert "the saving stays" in said(result)
    table = spread.table_of(result.accounts[0], result)
    assert table is not None
    assert "since the work" in table.caption


def test_nothing_to_compare_says_nothing(gas_house_result: SiteResult) -> None:
    for result in (gas_house_result, with_rows(gas_house_result)):
        account = result.accounts[0]
        assert spread.sentences(account, result) == ()
        assert spread.table_of(account, result) is None
        assert spread_figure(account, result, "x") is None


def test_the_table_shows_the_extremes_of_the_bills_left_out(gas_house_result: SiteResult) -> None:
    result = with_rows(gas_house_result, *FIRM)
    table = spread.table_of(result.accounts[0], result)
    assert table is not None
    first = [r[0].replace(NBSP, " ") for r in table.rows]
    assert first == [
        "as chosen",
        "flat on both sides",
        "every bill counts alike",
        "lowest without the bill of January 2022",
        "highest without the bill of February 2022",
    ]
    assert table.rows[1][-1] == "fits far worse"
    bills = spread.bills_table(result.accounts[0], result)
    assert bills is not None
    assert [r[0] for r in bills.rows] == ["3", "4"]


def test_the_picture_names_the_answer_zero_and_the_extremes(gas_house_result: SiteResult) -> None:
    result = with_rows(gas_house_result, *FIRM)
    picture = spread_figure(result.accounts[0], result, "a1-spread")
    assert picture is not None
    root = ET.fromstring(picture.standalone().split("\n", 1)[1])
    told = " | ".join("".join(t.itertext()) for t in root.iter(f"{SVG}text")).replace(NBSP, " ")
    assert "no change" in told
    assert "as chosen: 19 % less" in told
    assert "lowest without January 2022, highest without February 2022" in told
    assert "Whatever is changed below" in picture.alt
    again = spread_figure(result.accounts[0], result, "a1-spread")
    assert again == picture


def test_the_picture_stays_within_its_rows(gas_house_result: SiteResult) -> None:
    many = [row("station", f"station {i}", estimate(150.0, 100.0, 200.0)) for i in range(60)]
    result = with_rows(gas_house_result, *many)
    picture = spread_figure(result.accounts[0], result, "x")
    assert picture is not None
    assert picture.height < 110 + 21 * MOST_ROWS


def test_absurd_numbers_are_left_out_of_the_picture(gas_house_result: SiteResult) -> None:
    absurd = row("weights", "every bill counts alike", estimate(1e300, -1e300, 1e300))
    result = with_rows(gas_house_result, absurd, *FIRM)
    assert spread_figure(result.accounts[0], result, "x") is not None


@pytest.mark.parametrize("statistics", [True, False])
def test_the_terminal_has_the_sentence_always_and_the_table_behind(
    gas_house_result: SiteResult, statistics: bool
) -> None:
    text = to_text(with_rows(gas_house_result, *FIRM), statistics=statistics)
    assert "Whatever is changed below" in text
    assert ("lowest without the bill of January 2022" in text) == statistics
    assert max(len(line) for line in text.splitlines()) <= 80


def test_the_page_and_the_json_carry_every_row(gas_house_result: SiteResult) -> None:
    hostile = row("station", "<b>hill</b>", estimate(150.0, 100.0, 200.0))
    result = with_rows(gas_house_result, *FIRM, hostile)
    page = to_html(result)
    assert "How firm the answer is" in page
    assert "<b>hill" not in page
    rows = to_dict(result)["sensitivity"]
    assert [r["changes"] for r in rows][:2] == ["as chosen", "same form"]
    assert rows[1]["no_rival"] == "fits far worse"
    assert rows[3]["period"] == 3
    assert rows[3]["weather"] == "the station, ten years"
    assert rows[-1]["weather"] == "<b>hill</b>"
