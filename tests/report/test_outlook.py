"""What a plan says: sentences, table and picture of hand-made outlooks."""

from __future__ import annotations

from dataclasses import replace

import pytest

from normalize.days import day_of_iso
from normalize.plan import Outlook
from normalize.report import outlook as words
from normalize.report.figure_outlook import outlook_figure
from normalize.report.numbers import NBSP
from normalize.savings.planning import Prospect, Smallest
from tests.report.conftest import make_fit

START = day_of_iso("2025-01-01")
COUNTS = range(3, 37)


def prospect(n: int, share: float, *, normal: bool) -> Prospect:
    """Smallest saving ``share`` at even odds and half as much again four times in five."""
    one = Smallest(10.0 * share, 15.0 * share, 10.0)
    return Prospect(
        n, START + 30 * n, one, one if normal else None, "" if normal else "a normal year needs 9"
    )


def made(scale: float = 1.0, *, never: bool = False) -> Outlook:
    return Outlook(
        "gas", "natural gas", "therm", "", fit=make_fit(), nac=842.4,
        first=day_of_iso("2022-12-01"), last=day_of_iso("2024-12-01"), length=30, starts=START,
        work_named=False, years=(2014, 2023),
        prospects=tuple(
            prospect(n, scale * 0.6 / n, normal=n >= 9 and not never) for n in COUNTS
        ),
    )  # fmt: skip


def said(outlook: Outlook, hoped: float | None = None) -> str:
    return " ".join(words.sentences(outlook, 0.90, hoped)).replace(NBSP, " ")


def test_a_year_of_bills_comes_first() -> None:
    """0.6/12 is 5 % at even odds, half as much again 7.5 % four times in five."""
    text = said(made())
    assert text.startswith(
        "With 12 more monthly bills a saving of 7.5 % of gas in a normal year, or more, would "
        "show four times in five; 5.0 % at even odds."
    )
    assert "one bill's length is allowed for the work" in text
    assert "2014–2023" in text


def test_the_hoped_for_saving_gets_its_number_and_its_month() -> None:
    """15·0.6/n ≤ 12 % from n = 7.5 on: 8 bills of 30 days from January 2025 end in August."""
    text = said(made(), 0.12)
    assert "The 12 % of gas hoped for needs 8 more monthly bills, about until August 2025" in text
    assert "to show in a normal year it needs 9, about until September 2025" in text


def test_a_hope_too_small_is_told_so() -> None:
    assert "would show at even odds with 30 more monthly bills" in said(made(), 0.02)
    assert "too small to show even at even odds within 36 more bills" in said(made(10.0), 0.02)


def test_the_fewest_looked_at_is_called_at_most() -> None:
    assert "needs at most 3 more monthly bills" in said(made(0.1), 0.12)


def test_no_normal_year_is_said_with_its_reason() -> None:
    text = said(made(never=True), 0.12)
    assert "No number of bills up to 36 makes a normal year of gas: a normal year needs 9" in text
    assert "in a normal year it would not show four times in five with 36" in text


def test_nothing_known_says_why() -> None:
    none = Outlook("gas", "natural gas", "therm", "there are no usable bills before the work")
    assert said(none, 0.12) == (
        "For gas nothing can be foretold: there are no usable bills before the work."
    )
    assert words.table_of(none) is None
    assert outlook_figure(none, 0.12, "x") is None


def test_more_than_all_of_it_cannot_be_saved() -> None:
    table = words.table_of(made(20.0))
    assert table is not None
    assert table.rows[0][3] == "all of it"


def test_the_table_dashes_what_is_not_to_be_had() -> None:
    table = words.table_of(made())
    assert table is not None
    assert [r[0] for r in table.rows] == [str(n) for n in words.SHOWN]
    assert table.rows[0][4] == "–"
    assert "a normal year needs 9" in table.caption


@pytest.mark.parametrize("hoped", [None, 0.12, 0.001])
def test_the_picture_states_its_finding_and_is_the_same_twice(hoped: float | None) -> None:
    one, two = (outlook_figure(made(), hoped, "x") for _ in range(2))
    assert one is not None
    assert one == two
    assert one.title.startswith("Gas: ")
    assert (f"hoped for: {words.share_word(hoped)}" in one.body) if hoped else True


def test_a_hostile_name_stays_text() -> None:
    outlook = replace(made(), fuel="<b>gas</b>", unavailable="<script>")
    assert "<script>" in said(outlook)  # text; whoever shows it as HTML escapes it
    drawn = outlook_figure(replace(made(), fuel='<b>"gas"'), 0.12, "x")
    assert drawn is not None
    assert "<b>" not in drawn.standalone()
