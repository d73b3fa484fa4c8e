"""JSON: the keys other programs rely on, no NaN, the same bytes."""

from __future__ import annotations

import json
import math
from dataclasses import replace
from pathlib import Path
from typing import TYPE_CHECKING, Any

import pytest

from normalize.report.json import to_dict, to_json
from normalize.savings.results import Estimate

if TYPE_CHECKING:
    from normalize.site import SiteResult

# Copied from the schema of the project's design document ("JSON of one site").
TOP = ["schema", "site", "confidence", "currency", "weather", "accounts", "total"]
WEATHER = ["station", "observed", "long_term", "days_filled"]
ACCOUNT = ["account", "fuel", "unit", "before", "after", "normalized", "avoided", "price", "co2",
           "ledger", "checks"]  # fmt: skip
FIT = ["form", "balance_heating_f", "balance_cooling_f", "base_load", "heating_slope",
       "cooling_slope", "line_slope", "n_periods", "r2", "cv_rmse", "nac", "nac_low",
       "nac_high"]  # fmt: skip
ESTIMATE = ["value", "low", "high", "fraction", "fraction_low", "fraction_high", "plain_low",
            "plain_high", "method", "unavailable"]  # fmt: skip
LEDGER = ["file", "line", "fate", "note"]
CHECK = ["name", "value", "limit", "meets", "source"]


def strict(text: str) -> Any:
    def refuse(name: str) -> None:
        raise AssertionError(f"{name} in JSON")

    return json.loads(text, parse_constant=refuse)


def has(given: dict[str, Any], keys: list[str]) -> None:
    assert [k for k in keys if k not in given] == []


def test_every_key_of_the_schema_is_there(any_result: SiteResult) -> None:
    told = strict(to_json(any_result))
    has(told, TOP)
    assert told["schema"] == 1
    has(told["weather"], WEATHER)
    for account in told["accounts"]:
        has(account, ACCOUNT)
        for side in ("before", "after"):
            has(account[side], FIT)
        for kind in ("normalized", "avoided"):
            has(account[kind], ESTIMATE)
            has(told["total"][kind], ["energy_mmbtu", "cost", "co2_kg"])
            for amount in told["total"][kind].values():
                has(amount, ["value", "low", "high"])
        has(account["price"], ["per_unit", "source"])
        has(account["co2"], ["kg_per_unit", "source"])
        for entry in account["ledger"]:
            has(entry, LEDGER)
        for check in account["checks"]:
            has(check, CHECK)


def test_a_null_has_its_reason_beside_it(half_known_result: SiteResult) -> None:
    gas, propane = to_dict(half_known_result)["accounts"]
    assert gas["normalized"]["value"] is None
    assert "270 are needed" in gas["normalized"]["unavailable"]
    assert gas["normalized"]["known_from"] == "2024-06-19"
    assert gas["after"]["form"] is None
    assert gas["after"]["unavailable"]
    assert propane["price"]["unavailable"]
    assert propane["co2"]["unavailable"]


def test_not_a_number_becomes_null_with_a_reason(gas_house_result: SiteResult) -> None:
    nan = float("nan")
    account = gas_house_result.accounts[0]
    assert account.savings.before is not None
    broken = replace(
        account.savings,
        before=replace(account.savings.before, durbin_watson=nan, r2=math.inf, se=(nan, nan)),
        normalized=Estimate(nan, nan, nan, nan, nan, nan, nan, nan),
    )
    result = replace(gas_house_result, accounts=(replace(account, savings=broken),))
    told = strict(to_json(result))["accounts"][0]
    assert told["before"]["durbin_watson"] is None
    assert sorted(told["before"]["null_reasons"]) == ["durbin_watson", "r2"]
    assert told["normalized"]["unavailable"]
    assert told["before"]["terms"][0]["se"] is None


def test_floats_round_trip(gas_house_result: SiteResult) -> None:
    third = 1.0 / 3.0
    estimate = replace(gas_house_result.accounts[0].savings.normalized, value=third)
    account = gas_house_result.accounts[0]
    account = replace(account, savings=replace(account.savings, normalized=estimate))
    told = strict(to_json(replace(gas_house_result, accounts=(account,))))
    assert told["accounts"][0]["normalized"]["value"] == third


def test_the_ledger_has_every_entry(gas_house_result: SiteResult) -> None:
    told = to_dict(gas_house_result)["accounts"][0]["ledger"]
    bills = gas_house_result.accounts[0].bills
    assert bills is not None
    assert len(told) == len(bills.ledger)


def test_same_result_same_bytes(any_result: SiteResult) -> None:
    assert to_json(any_result) == to_json(any_result)


@pytest.mark.parametrize(
    "name", ["<b>farm</b>", "\u05d1\u05d9\u05ea", "\ud800 half", "a\x00b", "🏠"]
)
def test_any_name_can_be_written(gas_house_result: SiteResult, name: str) -> None:
    named = replace(gas_house_result, site=replace(gas_house_result.site, name=name))
    text = to_json(named)
    assert text.encode("ascii")
    assert strict(text)["site"] == name


def keys_of(given: Any) -> set[str]:
    """Every key at any depth, leaving out those that are names of the user's or ours."""
    if isinstance(given, list):
        return set().union(*map(keys_of, given)) if given else set()
    if not isinstance(given, dict):
        return set()
    free = {"settings", "versions", "null_reasons"}
    return set(given).union(*(keys_of(v) for k, v in given.items() if k not in free))


def test_every_key_is_documented(any_result: SiteResult) -> None:
    document = Path(__file__).parents[2] / "docs" / "json.md"
    told = document.read_text(encoding="utf-8")
    assert [k for k in sorted(keys_of(to_dict(any_result))) if f"`{k}`" not in told] == []
