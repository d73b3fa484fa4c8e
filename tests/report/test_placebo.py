"""Invented work dates and checks as a reader meets them: words, picture, tables, JSON."""

from __future__ import annotations

from dataclasses import replace

import pytest

from normalize.days import day_of_iso
from normalize.report import checks_words, placebo_words, tables
from normalize.report.figure_placebo import placebo_figure
from normalize.report.html import to_html
from normalize.report.json import to_dict
from normalize.report.text import to_text
from normalize.savings.evidence import SideEvidence
from normalize.savings.influence import BillWeight
from normalize.savings.placebo import InventedDate, Placebo
from normalize.savings.results import Check, Estimate
from normalize.site import AccountResult, SiteResult

FIRST = day_of_iso("2022-02-01")


def change(fraction: float, half: float, *, nac: float = 800.0) -> Estimate:
    low, high = fraction - half, fraction + half
    return Estimate(
        nac * fraction, nac * low, nac * high, fraction, low, high, nac * low, nac * high, 0.90, "m"
    )


def placebo_of(*fractions: float, half: float = 0.05) -> Placebo:
    dates = tuple(
        InventedDate(FIRST + 30 * i, 12, 14, change(f, half)) for i, f in enumerate(fractions)
    )
    return Placebo(dates, 1, FIRST - 365, FIRST + 500)


def with_placebo(result: SiteResult, placebo: Placebo | None) -> SiteResult:
    account = replace(result.accounts[0], placebo=placebo)
    return replace(result, accounts=(account, *result.accounts[1:]))


def gas(result: SiteResult, placebo: Placebo | None) -> AccountResult:
    return with_placebo(result, placebo).accounts[0]


def plainly(text: str) -> str:
    return " ".join(text.replace("\u00a0", " ").split())


def test_the_outcome_the_largest_and_what_it_cannot_tell(gas_house_result: SiteResult) -> None:
    told = placebo_words.sentences(gas(gas_house_result, placebo_of(0.01, -0.08, 0.02)))
    assert plainly(told[0]).startswith("1 of 3 invented work dates would have announced a change,")
    assert "between February 1, 2022 and April 2, 2022" in plainly(told[0])
    assert "about 10 % is expected" in plainly(told[0])
    assert "8.0 % more (invented on March 3, 2022); the real change is 19 % less" in plainly(
        told[1]
    )
    assert "cannot say what caused" in told[2]


def test_none_and_one_are_told_in_words(gas_house_result: SiteResult) -> None:
    none = placebo_words.sentences(gas(gas_house_result, placebo_of(0.01, 0.02)))
    assert none[0].startswith("None of 2 invented work dates")
    one = placebo_words.sentences(gas(gas_house_result, placebo_of(0.01)))
    assert plainly(one[0]).startswith("One invented work date: no change announced, on February 1")


def test_a_baseline_too_short_is_one_sentence_and_no_picture(gas_house_result: SiteResult) -> None:
    short = Placebo(unavailable="there are 365 days and 540 are needed: about 6 more months")
    account = gas(gas_house_result, short)
    assert placebo_words.sentences(account) == (
        "Invented work dates were not tried: there are 365 days and 540 are needed: about 6 more "
        "months.",
    )
    assert placebo_figure(account, "k") is None
    assert placebo_words.table_of(account) is None
    page = to_html(with_placebo(gas_house_result, short))
    assert "were not tried: there are 365 days" in page
    assert "a1-placebo" not in page


def test_an_account_without_bills_says_nothing(gas_house_result: SiteResult) -> None:
    assert placebo_words.sentences(gas(gas_house_result, None)) == ()
    assert to_dict(with_placebo(gas_house_result, None))["accounts"][0]["placebo"] is None


def test_the_picture_states_the_finding_and_is_the_same_twice(gas_house_result: SiteResult) -> None:
    account = gas(gas_house_result, placebo_of(0.01, -0.08, 0.02))
    picture = placebo_figure(account, "a1-placebo")
    assert picture is not None
    assert picture.title == "1 of 3 invented work dates would have announced a change"
    assert "the diamond is the real work" in picture.caption
    assert ">the work</text>" in picture.body
    again = placebo_figure(account, "a1-placebo")
    assert again is not None
    assert again.inline() == picture.inline()


def test_changes_without_a_share_are_drawn_in_units(gas_house_result: SiteResult) -> None:
    """Net-metered accounts may have no use to take a share of."""
    bare = Estimate(12.0, -5.0, 30.0, None, None, None, -5.0, 30.0, 0.90, "m")
    account = gas(gas_house_result, Placebo((InventedDate(FIRST, 12, 12, bare),), 0, 0, 1))
    picture = placebo_figure(account, "k")
    assert picture is not None
    assert "therms less in a normal year" in picture.body
    assert "12 therms less" in plainly(" ".join(placebo_words.sentences(account)))


def test_absurd_numbers_draw_nothing(gas_house_result: SiteResult) -> None:
    wild = Estimate(1e300, -1e300, 1e300, 1e300, -1e300, 1e300, 0.0, 0.0, 0.90, "m")
    account = gas(gas_house_result, Placebo((InventedDate(FIRST, 12, 12, wild),), 0, 0, 1))
    assert placebo_figure(account, "k") is None
    assert to_html(with_placebo(gas_house_result, account.placebo))


def test_the_report_and_the_terminal_carry_it(gas_house_result: SiteResult) -> None:
    result = with_placebo(gas_house_result, placebo_of(0.01, -0.08, 0.02))
    page = to_html(result)
    assert "Invented work dates</h3>" in page
    assert 'id="a1-placebo-t"' in page
    assert "would have announced more use" in page
    assert "Invented work dates\n1 of 3" in to_text(result, width=200)
    told = to_dict(result)["accounts"][0]["placebo"]
    assert told["announced"] == 1
    assert told["unavailable"] is None
    assert told["largest_day"] == "2022-03-03"
    assert told["dates"][1]["normalized"]["verdict"] == "increase"
    assert told["dates"][0]["day"] == "2022-02-01"
    assert told["without_answer"] == 1


def test_a_reason_from_outside_is_escaped(gas_house_result: SiteResult) -> None:
    page = to_html(with_placebo(gas_house_result, Placebo(unavailable="<script>x</script>")))
    assert "<script>" not in page


CHECKS = (
    Check("CV(RMSE)", "before", 0.0712, 0.25, True, "bills scatter", "look twice", "a guideline"),
    Check("number of bills", "before", 23.0, 9.0, True, "the fit rests on 23 bills", "", "them"),
    Check("influence", "before", 1.52, 1.0, False, "one bill pulls", "look at it", "a book"),
    Check("temperatures seen", "after", 79.0, None, None, "from 2 to 81", "", "a guideline"),
)


def test_missed_checks_stand_first_and_in_full() -> None:
    told = checks_words.lines(CHECKS)
    assert told[0] == (
        "Not met: influence, before 1.52 (limit 1). "
        "One bill pulls. What to do: look at it. [a book]"
    )
    assert told[1] == (
        "Met or for information, before: CV(RMSE) 0.0712 (limit 0.25); number of bills 23 (limit 9)"
    )
    assert told[2] == "Met or for information, after: temperatures seen 79"
    assert told[3] == "These are asked for by: a guideline; them"


def test_the_table_of_checks_has_meaning_and_advice() -> None:
    rows = tables.checks_table(CHECKS).rows
    assert (rows[0][2], *rows[0][4:6]) == ("met", "0.0712", "0.25")
    assert rows[1][4:6] == ("23", "9")
    assert rows[2][3] == "One bill pulls. What to do: look at it."
    assert (rows[3][2], rows[3][5]) == ("for information", "–")


@pytest.mark.parametrize(
    ("cook", "note"), [(0.1, ""), (0.5, "over 4/n"), (1.2, "over 1"), (float("nan"), "")]
)
def test_a_bill_of_great_weight_is_named_and_stays_in(
    gas_house_result: SiteResult, cook: float, note: str
) -> None:
    fit = gas_house_result.accounts[0].savings.before
    assert fit is not None
    others = [BillWeight(i, "before", 0.1, 0.01, 0.1) for i in range(4, 15)]
    weights = (BillWeight(3, "before", 0.31, cook, 1.4), *others)
    spans = tuple((FIRST + 30 * i, FIRST + 30 * i + 30) for i in range(12))
    side = SideEvidence("before", fit, FIRST, FIRST + 360, 20.0, 70.0, weights, spans, None, None,
                        False)  # fmt: skip
    account = replace(gas_house_result.accounts[0], evidence=(side,))
    table = tables.weights_table(account)
    assert table is not None
    assert table.rows[0][:5] == ("3", "2022-02-01", "2022-03-03", "before", "0.31")
    assert table.rows[0][-1].startswith(note)
    assert bool(note) == ("it stays in" in table.rows[0][-1])
    told = to_dict(replace(gas_house_result, accounts=(account,)))["accounts"][0]["bill_weights"]
    assert told[0]["period"] == 3
    assert told[0]["cook"] == (cook if cook == cook else None)
    assert "What each bill weighs" in to_html(replace(gas_house_result, accounts=(account,)))


def test_no_evidence_no_table(gas_house_result: SiteResult) -> None:
    assert tables.weights_table(replace(gas_house_result.accounts[0], evidence=())) is None
