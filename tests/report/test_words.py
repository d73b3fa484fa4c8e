"""Sentences: value and range in, words out."""

from __future__ import annotations

from dataclasses import replace
from typing import TYPE_CHECKING

import pytest

from normalize.days import day_of_iso
from normalize.report import numbers as n
from normalize.report import site_words, words
from normalize.savings.results import Amount, Estimate

if TYPE_CHECKING:
    from normalize.site import SiteResult


def said(text: str) -> str:
    """Plain spaces, so that the tables below can be read."""
    return text.replace(n.NBSP, " ")


def estimate(value: float, low: float, high: float, of: float = 1000.0) -> Estimate:
    return Estimate(value, low, high, value / of, low / of, high / of)


NORMALIZED = [
    # (estimate, fuel, sentence): the first is the wording look.md asks for
    (
        estimate(180, 140, 230), "natural gas",
        "Your house used 18 % less gas in a normal year after the work (between 14 % and 23 %).",
    ),
    (
        estimate(-430, -550, -310), "electricity",
        "Your house used 43 % more electricity in a normal year after the work "
        "(between 31 % and 55 %).",
    ),
    (
        estimate(10, -31, 52), "electricity",
        "Electricity use in a normal year could not be told from no change: it is somewhere "
        "between 3.1 % more and 5.2 % less.",
    ),
    (
        estimate(0, -31, 31), "propane",
        "Propane use in a normal year could not be told from no change: it is somewhere "
        "between 3.1 % more and 3.1 % less.",
    ),
    (
        estimate(-52_000, -61_000, -43_000), "electricity",
        "Your house used 5,200 % more electricity in a normal year after the work "
        "(between 4,300 % and 6,100 %).",
    ),
    (
        estimate(182, 181, 183), "natural gas",  # two digits would make value and ends alike
        "Your house used 18.2 % less gas in a normal year after the work "
        "(between 18.1 % and 18.3 %).",
    ),
    (
        estimate(1000, 990, 1010), "heating oil",
        "Your house used 100 % less oil in a normal year after the work "
        "(between 99.0 % and 101 %).",
    ),
]  # fmt: skip


@pytest.mark.parametrize(("given", "fuel", "sentence"), NORMALIZED)
def test_normalized_sentence(given: Estimate, fuel: str, sentence: str) -> None:
    """Regression, not truth: the wording is this project's own."""
    told = words.normalized_sentence(given, fuel, "therm", subject="Your house")
    assert said(told) == sentence


def test_touching_zero_is_not_a_saving() -> None:
    told = words.normalized_sentence(estimate(50, 0.0, 100), "natural gas", "therm")
    assert "could not be told from no change" in told
    assert "no change and 10" in said(told)


def test_units_stand_in_when_there_is_nothing_to_divide_by() -> None:
    """A heat pump's electricity where there was none before."""
    none_before = Estimate(-3200.0, -3500.0, -2900.0, float("nan"), None, None)
    told = said(words.normalized_sentence(none_before, "electricity", "kWh"))
    assert "3,200 kWh more electricity" in told
    assert "(between 2,900 and 3,500)" in told
    assert "%" not in told


def test_a_value_without_a_range_says_so() -> None:
    told = words.normalized_sentence(
        Estimate(100.0, None, None, 0.1, None, None), "natural gas", "therm"
    )
    assert "100" in told
    assert "its range is not known" in told


def test_a_nan_is_not_an_answer() -> None:
    nan = float("nan")
    told = words.normalized_sentence(Estimate(nan, nan, nan, nan, nan, nan), "propane", "gal")
    assert told.startswith("The change in propane use")
    assert "is not known" in told
    assert "nan" not in told.replace("propane", "")


def test_not_known_yet_says_why_and_when() -> None:
    given = Estimate.none("the bills after the work cover 121 days; 270 are needed",
                          known_from=day_of_iso("2024-06-19"))  # fmt: skip
    told = said(words.normalized_sentence(given, "natural gas", "therm"))
    assert "not known yet: the bills after the work cover 121 days; 270 are needed." in told
    assert "known from about June 19, 2024, if bills keep coming" in told


def test_avoided_use_is_so_far_under_twelve_months() -> None:
    given = replace(estimate(120, 80, 160), so_far=True)
    told = said(words.avoided_sentence(given, "natural gas", "therm", 121))
    assert told.startswith("So far, in the 4 months billed since the work, this site used 12 %")
    assert "in the same weather (between 8.0 % and 16 %)" in told
    whole = words.avoided_sentence(estimate(120, 80, 160), "natural gas", "therm", 365)
    assert "So far" not in whole


def test_an_account_without_answer_is_told_with_its_reason(half_known_result: SiteResult) -> None:
    told = words.answer(half_known_result.accounts[1])
    assert len(told) == 1
    assert "no column looks like usage" in told[0]


def test_what_is_known_comes_first(half_known_result: SiteResult) -> None:
    """Avoided use so far is known before the normal year is."""
    first, second = words.answer(half_known_result.accounts[0])
    assert first.startswith("So far")
    assert "not known yet" in second


MONEY = [
    (estimate(164.2, 128.1, 200.4), 1.32, "USD", "$220 less a year (between $170 and $260)"),
    (estimate(-100, -120, -80), 2.0, "USD", "$200 more a year (between $160 and $240)"),
    (estimate(10, -31, 52), 1.0, "USD", "somewhere between $31 more and $52 less a year"),
    (estimate(100, 80, 120), 1.5, "CAD", "150 CAD less a year (between 120 CAD and 180 CAD)"),
]


@pytest.mark.parametrize(("given", "price", "currency", "ending"), MONEY)
def test_money_sentence(given: Estimate, price: float, currency: str, ending: str) -> None:
    told = said(words.money_sentence(given, price, currency, "therm", "site file"))
    assert told.endswith(f"{ending}.")
    assert "a therm (site file)" in told


@pytest.mark.parametrize("price", [None, float("nan"), float("inf")])
def test_no_price_no_sentence(price: float | None) -> None:
    assert words.money_sentence(estimate(1, 0.5, 2), price, "USD", "therm") == ""


def test_a_total_gives_both_ranges_and_what_it_leaves_out() -> None:
    amount = Amount(15.1, 11.8, 18.5, 10.0, 20.2, missing=("electricity", "propane"))
    told = said(site_words.total_sentence("energy", amount, words.unit_form("million Btu")))
    assert "15.1 million Btu less" in told or "15 million Btu less" in told
    assert "between 12 and 18" in told or "between 11.8 and 18.5" in told
    assert "if all errors lean the same way, between 10" in told
    assert told.endswith("This leaves out electricity and propane.")


def test_a_total_that_is_not_known_says_why() -> None:
    amount = Amount(missing=("gas",), unavailable="no account has an answer")
    told = site_words.total_sentence("cost", amount, words.money_form("USD"))
    assert "not known: no account has an answer." in told
    assert "leaves out gas" in told


def test_no_sentence_claims_a_cause(any_result: SiteResult) -> None:
    claims = ("caused", "because of the work", "due to", "thanks to", "saved")
    for account in any_result.accounts:
        for sentence in (*words.answer(account), *words.worth(account, "USD")):
            assert not [c for c in claims if c in sentence]
    assert "cannot say what caused it" in site_words.CAUSE


def test_the_usual_cautions_are_always_there(any_result: SiteResult) -> None:
    """Combustion, wiring, ventilation, heating failure (practice.md, common practice)."""
    told = " ".join(site_words.cautions_of(any_result))
    for word in ("burners", "wiring", "ventilation", "heating has failed", "local codes"):
        assert word in told


def test_accounts_of_one_fuel_are_told_apart(gas_house_result: SiteResult) -> None:
    first = gas_house_result.accounts[0]
    second = replace(first, account="shop 0012345678")
    both = replace(gas_house_result, accounts=(first, second))
    assert words.which_of(first, gas_house_result) == ""
    told = words.headline(second, which=words.which_of(second, both))
    assert "on the account shop …5678" in told
    assert "12345678" in words.which_of(second, both, show_accounts=True)


@pytest.mark.parametrize(
    ("text", "shown"),
    [
        ("0012345678", "…5678"),
        ("1234-5678-90", "…7890"),
        ("gas_20230911.csv", "gas_20230911.csv"),
        ("Guideline 14-2014", "Guideline 14-2014"),
        ("mean of 10 years, 2012-2021", "mean of 10 years, 2012-2021"),
        ("12 Quince Street", "12 Quince Street"),
        ("use 1,234,567 kWh", "use 1,234,567 kWh"),
        ("use 123456.5 kWh", "use 123456.5 kWh"),
        ("2023-09-11 to 2023-10-12", "2023-09-11 to 2023-10-12"),
    ],
)
def test_account_numbers_are_masked_and_dates_are_not(text: str, shown: str) -> None:
    assert n.mask(text) == shown
