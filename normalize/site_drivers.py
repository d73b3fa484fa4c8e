"""The drivers of a site's accounts, read from the files that site.toml names."""

from __future__ import annotations

from typing import TYPE_CHECKING

from normalize.errors import BillError

if TYPE_CHECKING:
    from collections.abc import Sequence

    from normalize.bills.driver_rows import DriverAnswers
    from normalize.bills.periods import Bills
    from normalize.fitting.day_types import Calendar
    from normalize.fitting.drivers import DailyAmounts
    from normalize.sitefile import AccountPlan, SiteFile
    from normalize.sitefile.values import DayTypesPlan, DriverPlan

Source = tuple[str, str]


def read_site_drivers(
    plan: SiteFile, bills: Sequence[Bills | None]
) -> tuple[tuple[tuple[DailyAmounts, ...], ...], tuple[Source, ...]]:
    """Drivers of each account, in the order of the accounts, and the files they came from.

    A driver's file must be readable, for an answer without it is another answer.
    Raises MissingFile and BillError, as the readers do.
    """
    found: list[list[DailyAmounts]] = [[] for _ in plan.accounts]
    sources: list[Source] = []
    for driver in plan.drivers:
        for at, daily, source in _driver(driver, plan.accounts, bills):
            found[at].append(daily)
            sources.append(source)
    if plan.day_types is not None:
        calendar, listed = _calendar(plan.day_types)
        sources += listed
        for at in _touched(plan.day_types.accounts, plan.accounts):
            found[at] += _day_types(calendar, bills[at])
    return tuple(tuple(each) for each in found), tuple(dict.fromkeys(sources))


def _touched(named: tuple[str, ...], accounts: Sequence[AccountPlan]) -> list[int]:
    return [i for i, account in enumerate(accounts) if not named or account.name in named]


def _driver(
    driver: DriverPlan, accounts: Sequence[AccountPlan], bills: Sequence[Bills | None]
) -> list[tuple[int, DailyAmounts, Source]]:
    from normalize.bills.driver_rows import read_driver
    from normalize.fitting.drivers import by_day

    touched = _touched(driver.accounts, accounts)
    normal, said = _normal(driver)
    if driver.file is not None:
        try:
            rows = read_driver(driver.file, driver.name, _answers(driver))
        except BillError as err:
            raise _of(driver, err) from None
        daily = by_day(driver.name, rows, normal=normal, normal_from=said)
        return [(i, daily, rows.source) for i in touched]
    return _columns_of_bills(driver, touched, accounts, bills)


def _columns_of_bills(
    driver: DriverPlan,
    touched: Sequence[int],
    accounts: Sequence[AccountPlan],
    bills: Sequence[Bills | None],
) -> list[tuple[int, DailyAmounts, Source]]:
    """A column of the accounts' own bill files; one that no account has is an error."""
    from normalize.bills.driver_rows import driver_of_bills
    from normalize.fitting.drivers import by_day

    normal, said = _normal(driver)
    out: list[tuple[int, DailyAmounts, Source]] = []
    problem: BillError | None = None
    for i in touched:
        mine = bills[i]
        if mine is None:
            continue
        try:
            rows = driver_of_bills(accounts[i].bills, mine, driver.name, _answers(driver))
        except BillError as err:
            problem = problem or err
            if driver.accounts:
                raise _of(driver, err) from None
            continue
        daily = by_day(driver.name, rows, normal=normal, normal_from=said)
        out.append((i, daily, rows.source))
    if problem is not None and not out:
        raise _of(driver, problem)
    return out


def _of(driver: DriverPlan, err: BillError) -> BillError:
    return type(err)(
        f"the driver {driver.name!r}: {err.found}",
        where=err.where,
        wanted=err.wanted,
        next_step=err.next_step,
    )


def _normal(driver: DriverPlan) -> tuple[float | None, str]:
    """Its amount a day in a normal year, a long-term year having 365 days."""
    if driver.normal is not None:
        return driver.normal, "as site.toml says"
    if driver.normal_per_year is not None:
        return driver.normal_per_year / 365.0, "as site.toml says"
    return None, ""


def _answers(driver: DriverPlan) -> DriverAnswers:
    from normalize.bills.driver_rows import DriverAnswers

    return DriverAnswers(**driver.reader)  # type: ignore[arg-type]


def _calendar(plan: DayTypesPlan) -> tuple[Calendar, list[Source]]:
    from normalize.bills.date_list import read_days
    from normalize.fitting.day_types import Calendar

    holidays, sources, source = plan.holidays, [], "site.toml"
    if plan.holidays_file is not None:
        holidays, listed = read_days(plan.holidays_file)
        sources.append(listed)
        source = listed[0]
    calendar = Calendar(
        weekend=plan.weekend,
        holidays=holidays,
        terms=plan.school_terms,
        holidays_a_year=plan.holidays_per_year,
        school_days_a_year=plan.school_days_per_year,
        source=source,
    )
    return calendar, sources


def _day_types(calendar: Calendar, bills: Bills | None) -> tuple[DailyAmounts, ...]:
    from normalize.fitting.day_types import day_types

    if bills is None or bills.periods.n == 0:
        return ()
    first, last = int(bills.periods.start.min()), int(bills.periods.end.max())
    return day_types(calendar, first, last)
