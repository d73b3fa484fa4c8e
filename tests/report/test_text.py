"""The terminal's text: answer first, within its width, safe to print."""

from __future__ import annotations

from dataclasses import replace
from typing import TYPE_CHECKING

import pytest

from normalize.report.text import columns, to_text

if TYPE_CHECKING:
    from normalize.site import SiteResult


def test_the_answer_comes_before_the_statistics(gas_house_result: SiteResult) -> None:
    told = to_text(gas_house_result, width=400)
    places = [told.index(w) for w in (
        "This site used 19 % less gas in a normal year",
        "could not be told from no change",
        "All accounts together",
        "Cautions",
        "Coefficients before the work",
        "Forms tried",
        "Checks",
        "Ledger.",
        "Versions:",
    )]  # fmt: skip
    assert places == sorted(places)


def test_statistics_can_be_left_away(gas_house_result: SiteResult) -> None:
    short = to_text(gas_house_result, statistics=False)
    assert "19 % less gas" in short
    assert "Coefficients" not in short
    assert to_text(gas_house_result).startswith(short.rstrip())


@pytest.mark.parametrize("width", [40, 60, 80, 120])
@pytest.mark.parametrize("plain", [False, True])
def test_no_line_is_wider_than_the_terminal(
    any_result: SiteResult, width: int, plain: bool
) -> None:
    lines = to_text(any_result, width=width, ascii=plain).splitlines()
    assert [line for line in lines if columns(line) > width] == []


def test_ascii_is_ascii_and_loses_nothing(gas_house_result: SiteResult) -> None:
    named = replace(
        gas_house_result, site=replace(gas_house_result.site, name="Haus „Grün“ \u05d1 🏠")
    )
    told = to_text(named, ascii=True)
    assert told.isascii()
    assert "\\u05d1" in told
    assert "per deg F" in told
    assert "\x00" not in told


def test_every_caution_and_check_is_told(any_result: SiteResult) -> None:
    told = " ".join(to_text(any_result).split())
    for caution in any_result.cautions:
        assert caution in told
    for account in any_result.accounts:
        for caution in account.cautions:
            assert caution in told
        for check in account.checks:
            assert check.source in told


def test_every_form_tried_is_told_with_its_reason(gas_house_result: SiteResult) -> None:
    told = " ".join(to_text(gas_house_result).split())
    for tried in gas_house_result.accounts[0].tried_before:
        assert tried.form in told
        assert tried.reason in told


def test_a_terminal_is_not_commanded_and_accounts_stay_private(
    gas_house_result: SiteResult,
) -> None:
    account = replace(
        gas_house_result.accounts[0],
        account="0012345678",
        cautions=("\x1b[2J\x1b]0;owned\x07 meter 99887766554",),
    )
    result = replace(
        gas_house_result,
        accounts=(account,),
        site=replace(gas_house_result.site, name="Ev\x1b[31mil\r\nhouse\u202e"),
    )
    told = to_text(result)
    assert "\x1b" not in told
    assert "\x07" not in told
    assert "\u202e" not in told
    assert "12345678" not in told
    assert "99887766554" not in told
    assert "…5678" in told
    assert "0012345678" in to_text(result, show_accounts=True)


def test_an_unreadable_account_is_told_and_ends_nothing(half_known_result: SiteResult) -> None:
    told = " ".join(to_text(half_known_result).split())
    assert told.count("no column looks like usage") == 2
    assert "No fit after the work: 4 bills, 6 are needed." in told
    assert "There is no normal year" in told


def test_same_result_same_text(any_result: SiteResult) -> None:
    assert to_text(any_result) == to_text(any_result)
