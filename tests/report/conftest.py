"""Hand-made sites for the report's tests.

The numbers look like real ones but nothing is fitted here: lines are drawn first, bills are
scattered about them with a seeded generator, and the statistics are plausible constants.
The place, the station and the people are invented.
"""

from __future__ import annotations

from dataclasses import replace
from pathlib import Path

import numpy as np
import pytest

from normalize.bills.periods import BillRow, Bills, LedgerEntry, Periods
from normalize.days import day_of_iso
from normalize.fitting.results import Fit, FormTried
from normalize.savings.results import Amount, Check, Estimate, Price, Savings, Total
from normalize.site import AccountResult, Curve, PeriodRow, Site, SiteResult
from normalize.sitefile import AccountPlan, Change, Upgrade
from normalize.units import Factor
from normalize.weather.temperature import DailyTemperature
from normalize.weather.year import LongTermYear

WORK = (day_of_iso("2023-09-11"), day_of_iso("2023-09-23"))
FIRST = day_of_iso("2012-01-01")
HASH = "9f86d081884c7d659a2feaa0c55ad015a3bf4f1b2b0b822cd15d6c15b0f00a08"


def temperatures(n_days: int = 5200) -> DailyTemperature:
    """A winter-cold place: a yearly wave and a seeded wobble. Regression, not truth."""
    rng = np.random.default_rng(20230911)
    day = np.arange(n_days)
    wave = 48.0 - 26.0 * np.cos(2 * np.pi * (day - 18) / 365.25)
    wobble = np.zeros(n_days)
    for i, step in enumerate(rng.normal(0.0, 4.6, n_days)):
        wobble[i] = (0.7 * wobble[i - 1] if i else 0.0) + step
    filled = np.zeros(n_days, dtype=np.bool_)
    filled[[400, 401, 4100]] = True
    return DailyTemperature(
        station="Alder Falls airfield",
        first_day=FIRST,
        temp_f=wave + wobble,
        filled=filled,
        method="mean of daily maximum and minimum",
        source=(("station.csv", HASH),),
        notes=("3 days missing, filled from their neighbours' departure from the day's mean",),
    )


def long_term(weather: DailyTemperature, days: int = 3650) -> LongTermYear:
    temp = np.sort(weather.temp_f[:days])
    weight = np.full(temp.shape, 365.0 / temp.shape[0])
    return LongTermYear(
        name="mean of 10 years, 2012-2021",
        temp_f=temp,
        weight=weight,
        cum_days=np.concatenate([[0.0], np.cumsum(weight)]),
        cum_degrees=np.concatenate([[0.0], np.cumsum(weight * temp)]),
        station=weather.station,
        method="mean of whole calendar years",
        years=tuple(range(2012, 2022)),
        left_out=((2011, "41 days missing; at most 15 are allowed"),),
        source=weather.source,
    )


def make_fit(form: str = "heating", **changes: object) -> Fit:
    base = Fit(
        form=form,
        balance_heating_f=61.2 if "heating" in form or form == "two slopes" else None,
        balance_cooling_f={"cooling": 66.0, "heating and cooling": 68.5, "two slopes": 61.2}.get(
            form
        ),
        base_load=0.61,
        heating_slope=0.121 if "heating" in form or form == "two slopes" else None,
        cooling_slope=0.43 if "cooling" in form or form == "two slopes" else None,
        line_slope=-0.08 if form == "line" else None,
        n_periods=24,
        n_days=731,
        rss=41.2,
        r2=0.981,
        cv_rmse=0.0713,
        bias=1.2e-16,
        terms=("base load", "heating slope"),
        se=(0.11, 0.0037),
        se_full=(0.14, 0.0049),
        t=(5.545, 32.7),
        aicc=-31.25,
        bic=-29.74,
        mean_use=2.21,
        balance_heating_range_f=(58.9, 63.4) if form == "heating" else None,
        rho=0.18,
        durbin_watson=1.61,
        set_aside=1,
    )
    return replace(base, **changes)  # type: ignore[arg-type]


def make_estimate(value: float, low: float, high: float, of: float, **changes: object) -> Estimate:
    shrink = 0.82
    base = Estimate(
        value=value,
        low=low,
        high=high,
        fraction=value / of,
        fraction_low=low / of,
        fraction_high=high / of,
        plain_low=value - shrink * (value - low),
        plain_high=value + shrink * (high - value),
        confidence=0.90,
        method="serial correlation integrated out (method §5)",
    )
    return replace(base, **changes)  # type: ignore[arg-type]


def period_rows(
    weather: DailyTemperature,
    before: Fit | None,
    after: Fit | None,
    *,
    start: int,
    lengths: list[int],
    noise: float = 0.07,
    seed: int = 1,
    work: tuple[int, int] | None = WORK,
) -> tuple[PeriodRow, ...]:
    """Bills scattered about the two lines, with an estimate and one set aside."""
    rng = np.random.default_rng(seed)
    rows: list[PeriodRow] = []
    for number, length in enumerate(lengths, start=1):
        end = start + length
        days = weather.temp_f[start - weather.first_day : end - weather.first_day]
        side, reason = _side(start, end, number, work)
        own = before if side in ("before", "older", "set aside") else after
        fitted = float(own.predict(days).mean()) if own is not None else float("nan")
        without = float(before.predict(days).mean()) if before is not None else float("nan")
        use_day = (fitted if np.isfinite(fitted) else 2.0) * (1.0 + noise * rng.normal())
        rows.append(
            PeriodRow(
                number=number,
                start=start,
                end=end,
                use=use_day * length,
                cost=18.0 + 1.32 * use_day * length,
                estimated=number == 9,
                joined=2 if number == 14 else 1,
                side=side,
                reason=reason,
                mean_temp_f=float(days.mean()),
                use_per_day=use_day,
                fitted_per_day=fitted if side in ("before", "after") else float("nan"),
                without_work_per_day=without,
            )
        )
        start = end
    return tuple(rows)


def _side(start: int, end: int, number: int, work: tuple[int, int] | None) -> tuple[str, str]:
    if number <= 2:
        return "older", "more than 24 months before the work"
    if number == 7:
        return "set aside", "12 % of its days have no weather; at most 10 % is allowed"
    if work is None or end <= work[0]:
        return "before", ""
    if start >= work[1]:
        return "after", ""
    return "work window", "touches the work window"


def bills_of(account: str, fuel: str, unit: str, rows: tuple[PeriodRow, ...], file: str) -> Bills:
    n = len(rows)
    ledger = [LedgerEntry(file, r.number + 1, f"period {r.number}", "") for r in rows]
    ledger.append(LedgerEntry(file, n + 2, "left out", "the same period is billed again on line 9"))
    ledger.append(
        LedgerEntry(file, n + 3, "period 14", "estimated reading, joined to the next actual one")
    )
    bill_rows = [BillRow(file, r.number + 1, r.start, r.end, r.use, r.cost) for r in rows]
    bill_rows += [
        BillRow(file, n + 2, rows[0].start, rows[0].end, rows[0].use, None),
        BillRow(file, n + 3, rows[0].start, rows[0].end, rows[0].use, None, estimated=True),
    ]
    return Bills(
        account=account,
        fuel=fuel,
        unit=unit,
        rows=tuple(bill_rows),
        periods=Periods(
            start=np.array([r.start for r in rows], dtype=np.int32),
            end=np.array([r.end for r in rows], dtype=np.int32),
            use=np.array([r.use for r in rows]),
            cost=np.array([r.cost for r in rows]),
            estimated=np.array([r.estimated for r in rows], dtype=np.bool_),
            joined=np.array([r.joined for r in rows], dtype=np.int32),
        ),
        ledger=tuple(ledger),
        source=((file, HASH[::-1]),),
        reading=("usage from the column 'therms'", "dates are month/day/year"),
    )


def curve(fit: Fit, low: float = -5.0, high: float = 88.0) -> Curve:
    temp = np.linspace(low, high, 94)
    return Curve(temp_f=temp, use_per_day=fit.predict(temp))


def checks_of(fit: Fit, side: str) -> tuple[Check, ...]:
    return (
        Check(
            "CV(RMSE)", side, fit.cv_rmse, 0.25, fit.cv_rmse <= 0.25,
            "bills scatter about the fit by 7 % of mean use",
            "look at the largest residuals in the table of periods",
            "ASHRAE Guideline 14-2014, whole building, prescriptive (memory)",
        ),
        Check(
            "months of bills", side, 24.0, 12.0, True, "two winters and two summers are seen",
            "wait for more bills", "common practice, no source",
        ),
        Check(
            "share of heating degree-days outside the weather seen", side, 0.012, 0.10, None,
            "the fit is hardly stretched beyond the weather it saw", "",
            "common practice, no source",
        ),
    )  # fmt: skip


def make_account(
    name: str,
    fuel: str,
    unit: str,
    weather: DailyTemperature,
    *,
    before: Fit | None,
    after: Fit | None,
    normalized: Estimate,
    avoided: Estimate,
    nac: tuple[Estimate, Estimate],
    lengths: list[int] | None = None,
    seed: int = 1,
    noise: float = 0.07,
    price: Price | None = None,
    co2: Factor | None = None,
    cautions: tuple[str, ...] = (),
    work: tuple[int, int] | None = WORK,
) -> AccountResult:
    if lengths is None:
        lengths = [30, 29, 33, 31, 30, 28, 32, 31, 30, 33, 29, 30] * 4 + [31, 30]
    start = day_of_iso("2021-06-14")
    rows = period_rows(
        weather, before, after, start=start, lengths=lengths, seed=seed, noise=noise, work=work
    )
    tried = tuple(
        FormTried(form, fit, fit is not None and form == chosen, reason)
        for chosen in ("heating",)
        for form, fit, reason in (
            ("flat", make_fit("flat", r2=0.0, aicc=22.1, bic=23.0, terms=("base load",),
                              se=(0.4,), se_full=None, t=(5.5,)),
             "a fit with a higher AICc than the one chosen (22.1 against −31.3)"),
            ("heating", before, ""),
            ("cooling", None, "offered only when asked for"),
            ("heating and cooling", None,
             "a slope cannot be told from zero (|t| 0.6, 2 is wanted)"),
        )
    )  # fmt: skip
    return AccountResult(
        account=name,
        fuel=fuel,
        unit=unit,
        bills=bills_of(name, fuel, unit, rows, f"{name}.csv"),
        unavailable="",
        periods=rows,
        tried_before=tried if before is not None else (),
        tried_after=tried if after is not None else (),
        savings=Savings(
            before=before,
            after=after,
            nac_before=nac[0],
            nac_after=nac[1],
            normalized=normalized,
            avoided=avoided,
            before_unavailable="" if before else "6 bills, 8 are needed",
            after_unavailable="" if after else "4 bills, 6 are needed",
            predicted_use=1604.2 if avoided.available else None,
            actual_use=1311.7 if avoided.available else None,
            reporting_days=731 if avoided.available else 0,
            same_form=(),
        ),
        curve_before=curve(before) if before else None,
        curve_after=curve(after) if after else None,
        price=price or Price(None, "", "no price in the site file and no cost on the bills"),
        co2=co2,
        mmbtu_per_unit=None,
        checks=(checks_of(before, "before") if before else ())
        + (checks_of(after, "after") if after else ()),
        cautions=cautions,
        work_start=work[0] if work else None,
        work_end=work[1] if work else None,
    )


def total_of(value: float, low: float, high: float, *, missing: tuple[str, ...] = ()) -> Amount:
    half = (high - low) / 2
    return Amount(value, low, high, value - 1.3 * half, value + 1.3 * half, missing)


def make_site(
    name: str,
    accounts: tuple[AccountResult, ...],
    weather: DailyTemperature,
    *,
    year: LongTermYear | None,
    normalized: Total,
    avoided: Total,
    cautions: tuple[str, ...] = (),
    upgrade: str = "attic insulation and air sealing",
) -> SiteResult:
    site = Site(
        name=name,
        folder=Path("somewhere"),
        weather=weather,
        year=year,
        year_unavailable="" if year else "the station has 4 whole years and 10 are asked for",
        accounts=tuple(AccountPlan(a.account, a.fuel, Path(f"{a.account}.csv")) for a in accounts),
        bills=tuple(a.bills for a in accounts),
        read_errors=tuple((a.account, a.unavailable) for a in accounts if a.bills is None),
        upgrades=(Upgrade(upgrade, WORK[0], WORK[1], 4150.0),),
        changes=(Change("second adult works from home", day_of_iso("2024-02-01"), None),),
        floor_area_ft2=1840.0,
        inputs=(
            ("site.toml", HASH),
            ("station.csv", HASH[::-1]),
            *((f"{a.account}.csv", HASH) for a in accounts),
        ),
    )
    return SiteResult(
        site=site,
        confidence=0.90,
        accounts=accounts,
        total_normalized=normalized,
        total_avoided=avoided,
        cautions=cautions,
        settings=(("confidence", "90 %, two-sided"), ("weights", "days of each period")),
        versions=(("normalize", "0.1.0"), ("python", "3.11.2"), ("numpy", "2.4.0")),
    )


CAUTIONS = (
    "The station is on a hill 12 miles from the site.",
    "The second adult began to work from home on 2024-02-01, inside the reporting period.",
)


def gas_house() -> SiteResult:
    """A clear gas saving; electricity that cannot be told from no change."""
    weather = temperatures()
    g1 = make_fit()
    g2 = make_fit(
        base_load=0.55, heating_slope=0.103, balance_heating_f=59.1, cv_rmse=0.062, r2=0.976,
        balance_heating_range_f=(56.0, 61.8), se=(0.09, 0.0034), t=(6.1, 30.3), rho=0.22,
    )  # fmt: skip
    e1 = make_fit(
        "cooling", base_load=14.6, cooling_slope=0.62, cv_rmse=0.094, r2=0.31,
        terms=("base load", "cooling slope"), se=(0.4, 0.09), t=(36.5, 6.9), se_full=None,
        balance_cooling_range_f=(62.0, 71.5), durbin_watson=float("nan"),
    )  # fmt: skip
    e2 = make_fit(
        "cooling", base_load=14.2, cooling_slope=0.60, cv_rmse=0.102, r2=0.29,
        balance_cooling_f=67.0, terms=("base load", "cooling slope"), se=(0.4, 0.1),
        t=(35.5, 6.0), se_full=None, balance_cooling_range_f=(61.0, 74.0),
    )  # fmt: skip
    gas = make_account(
        "gas", "natural gas", "therm", weather, before=g1, after=g2,
        normalized=make_estimate(164.2, 128.1, 200.4, 842.4),
        avoided=make_estimate(292.5, 230.0, 355.0, 1604.2),
        nac=(Estimate(842.4, 815.0, 870.1), Estimate(678.2, 651.4, 706.0)),
        price=Price(1.32, "site file"),
        co2=Factor(5.306, "kg CO2/therm", "EPA emission factors", "2024"),
        cautions=("The thermostat may have been changed with the work.",),
    )  # fmt: skip
    electricity = make_account(
        "electricity", "electricity", "kWh", weather, before=e1, after=e2, seed=2,
        normalized=make_estimate(112.0, -180.0, 404.0, 5810.0),
        avoided=make_estimate(60.0, -420.0, 540.0, 11500.0),
        nac=(Estimate(5810.0, 5602.0, 6018.0), Estimate(5698.0, 5480.0, 5916.0)),
        price=Price(0.171, "the bills' cost with the fixed charge taken out"),
        co2=Factor(0.3733, "kg CO2/kWh", "eGRID US average total output", "2022"),
    )  # fmt: skip
    return make_site(
        "Quince Street house", (gas, electricity), weather, year=long_term(weather),
        normalized=Total(total_of(16.8, 12.9, 20.7), total_of(235.9, 166.0, 306.0),
                         total_of(913.0, 680.0, 1146.0)),
        avoided=Total(total_of(29.5, 22.8, 36.1), total_of(396.0, 280.0, 512.0),
                      total_of(1574.0, 1170.0, 1978.0)),
        cautions=CAUTIONS,
    )  # fmt: skip


def farm() -> SiteResult:
    """Oil down, electricity up: a heat pump."""
    weather = temperatures()
    o1 = make_fit(base_load=0.42, heating_slope=0.094, cv_rmse=0.14)
    o2 = make_fit(base_load=0.05, heating_slope=0.012, cv_rmse=0.33, balance_heating_f=48.0,
                  balance_heating_range_f=(41.0, 57.0), r2=0.71)  # fmt: skip
    e1 = make_fit("flat", base_load=21.0, terms=("base load",), se=(0.5,), se_full=None, t=(42.0,),
                  cv_rmse=0.08, r2=0.0)  # fmt: skip
    e2 = make_fit(base_load=20.1, heating_slope=1.08, balance_heating_f=60.4, cv_rmse=0.09)
    oil = make_account(
        "oil", "heating oil", "gal", weather, before=o1, after=o2, noise=0.12,
        lengths=[41, 55, 38, 120, 62, 35, 33, 44, 130, 60, 38, 36, 50, 140, 66, 45, 90, 160, 120],
        normalized=make_estimate(580.0, 512.0, 648.0, 661.0),
        avoided=make_estimate(410.0, 340.0, 480.0, 505.0, so_far=True),
        nac=(Estimate(661.0, 610.0, 712.0), Estimate(81.0, 38.0, 124.0)),
        price=Price(3.9, "site file"),
        co2=Factor(10.21, "kg CO2/gal", "40 CFR 98 Table C-1", "2024"),
        cautions=("Deliveries are not readings: a fill that was not full moves use to the next.",),
    )  # fmt: skip
    electricity = make_account(
        "electricity", "electricity", "kWh", weather, before=e1, after=e2, seed=3,
        normalized=make_estimate(-5310.0, -5890.0, -4730.0, 7665.0),
        avoided=make_estimate(-4200.0, -4700.0, -3700.0, 7000.0, so_far=True),
        nac=(Estimate(7665.0, 7420.0, 7910.0), Estimate(12975.0, 12450.0, 13500.0)),
        price=Price(0.171, "site file"),
        co2=Factor(0.3733, "kg CO2/kWh", "eGRID US average total output", "2022"),
    )  # fmt: skip
    return make_site(
        "Hollow Elm farm", (oil, electricity), weather, year=long_term(weather),
        normalized=Total(total_of(61.9, 52.3, 71.5), total_of(1354.0, 1071.0, 1637.0),
                         total_of(3910.0, 3190.0, 4630.0)),
        avoided=Total(total_of(42.2, 32.5, 51.9), total_of(881.0, 595.0, 1167.0),
                      total_of(2600.0, 1870.0, 3330.0)),
        cautions=CAUTIONS, upgrade="heat pump",
    )  # fmt: skip


def half_known() -> SiteResult:
    """One account whose bills cannot be read, one that will be known from a date."""
    weather = temperatures()
    fit = make_fit()
    reason = "the bills after the work cover 121 days; 270 are needed"
    gas = make_account(
        "gas", "natural gas", "therm", weather, before=fit, after=None,
        lengths=[30, 29, 33, 31, 30, 28, 32, 31, 30, 33, 29, 30] * 2 + [31, 30, 30, 30, 31, 30, 30],
        normalized=Estimate.none(reason, known_from=day_of_iso("2024-06-19")),
        avoided=make_estimate(21.0, 4.0, 38.0, 180.0, so_far=True),
        nac=(Estimate(842.4, 815.0, 870.1), Estimate.none(reason)),
    )  # fmt: skip
    why = "propane.csv:1: no column looks like usage; wanted a header such as 'gal'. Name it."
    none = Estimate.none(why)
    propane = AccountResult(
        account="propane", fuel="propane", unit="gal", bills=None, unavailable=why, periods=(),
        tried_before=(), tried_after=(),
        savings=Savings(None, None, none, none, none, none, before_unavailable=why,
                        after_unavailable=why),
        curve_before=None, curve_after=None, price=Price(None, "", "no price is known"),
        co2=None, mmbtu_per_unit=None, checks=(), cautions=(),
    )  # fmt: skip
    empty = Amount(missing=("gas", "propane"), unavailable="no account has an answer")
    part = total_of(2.1, 0.4, 3.8, missing=("propane",))
    return make_site(
        "Two Ponds library", (gas, propane), weather, year=None,
        normalized=Total(empty, empty, empty), avoided=Total(part, empty, empty), cautions=CAUTIONS,
    )  # fmt: skip


@pytest.fixture(scope="session")
def gas_house_result() -> SiteResult:
    return gas_house()


@pytest.fixture(scope="session")
def farm_result() -> SiteResult:
    return farm()


@pytest.fixture(scope="session")
def half_known_result() -> SiteResult:
    return half_known()


@pytest.fixture(scope="session", params=["gas house", "farm", "half known"])
def any_result(request: pytest.FixtureRequest) -> SiteResult:
    return {"gas house": gas_house, "farm": farm, "half known": half_known}[request.param]()
