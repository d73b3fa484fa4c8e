"""Invented work dates: which are tried, what they announce where nothing changes, and why not."""

from __future__ import annotations

from dataclasses import replace

import numpy as np
import pytest

from normalize.bills.periods import Bills
from normalize.defaults import MIN_DAYS_A_SIDE, WINDOW_DAYS
from normalize.fitting.align import align
from normalize.fitting.batch import Batch, stations
from normalize.fitting.columns import AFTER, BEFORE, UNUSED
from normalize.savings.again import Asked
from normalize.savings.checks import MOST_ANNOUNCED, moved_before
from normalize.savings.compare import compare
from normalize.savings.placebo import Placebo, invented_dates, placebo_counts, placebo_of
from normalize.savings.sides import Work
from tests.savings.homes import simulate
from tests.savings.test_answers import STATION, house, year

pytestmark = pytest.mark.kernel
GAS = ("flat", "heating")


def all_before(batch: Batch) -> Batch:
    return replace(batch, side=np.full_like(batch.side, BEFORE))


@pytest.mark.parametrize("rho", [0.0, 0.5])
def test_one_invented_date_in_homes_without_change_alarms_in_a_tenth(rho: float) -> None:
    """Target of the issue: at most 12 % alarms of a 90 % range, 1 200 homes, 24 + 24 bills.

    Monte Carlo error of a true tenth: √(0.1·0.9/1200) = 0.9 %.
    """
    homes = simulate(1200, bills=24, rho=rho, noise=0.1, seed=41, effect=0.0)
    counts = placebo_counts(all_before(homes.batch), homes.table, [homes.year], most=1)
    assert (counts.dates == 1).all()
    assert (counts.alarms == counts.reductions + counts.increases).all()
    assert 0.05 <= counts.alarms.mean() <= 0.12


def test_a_change_inside_the_baseline_announces_itself() -> None:
    homes = simulate(60, bills=24, rho=0.0, noise=0.05, seed=5, effect=0.25)
    counts = placebo_counts(all_before(homes.batch), homes.table, [homes.year], most=9)
    assert (counts.reductions >= 1).all()
    assert (counts.reductions / counts.dates).mean() > MOST_ANNOUNCED  # so the check misses
    assert counts.increases.sum() == 0
    assert np.nanmedian(counts.largest) > 0.10


def test_an_accounts_own_placebo_is_its_row_in_a_batch() -> None:
    """One path for one and for many: the same dates, the same announcements."""
    bills, work = house(40, 14, noise=0.08)
    aligned = align(bills.periods, STATION)
    found = compare(aligned, work, year(), forms=GAS)
    alone = placebo_of(Asked(aligned, year(), GAS, 0.90), found.labels, work_start=work.start)
    homes = simulate(3, bills=24, rho=0.0, noise=0.1, seed=1, effect=0.0)
    n = aligned.n
    side = np.full(n, UNUSED, dtype=np.uint8)
    side[:40] = BEFORE
    other = homes.batch
    batch = Batch(
        start=np.concatenate([other.start, aligned.start]),
        end=np.concatenate([other.end, aligned.end]),
        use=np.concatenate([other.use, aligned.use]),
        side=np.concatenate([np.full_like(other.side, BEFORE), side]),
        offsets=np.append(other.offsets, other.offsets[-1] + n),
        station=np.append(other.station, 1).astype(np.int32),
        wanted=np.concatenate([other.wanted, other.wanted[:1]]),
        net=np.append(other.net, False),
    )
    first, last = int(batch.start.min()), int(batch.end.max())
    here = (0, homes.table.temp)
    table = stations([(int(homes.table.first_day[0]), here[1]), (0, STATION.temp_f)], first, last)
    counts = placebo_counts(batch, table, [homes.year, year()])
    assert counts.dates[3] == len(alone.dates)
    assert counts.alarms[3] == len(alone.announced)
    assert alone.largest is not None
    assert counts.largest[3] == alone.largest.normalized.fraction


def test_every_admissible_boundary_is_tried_and_no_other() -> None:
    """By hand: a boundary counts where 270 days lie within 24 months on either side of it."""
    bills, work = house(44, 12)
    p = bills.periods
    mine = np.arange(p.n) < 44
    days, sides = invented_dates(p.start, p.end, mine)
    by_hand = []
    for b in p.end[:44]:
        left = [i for i in range(44) if p.end[i] <= b
                and 0.5 * (p.start[i] + p.end[i]) >= b - WINDOW_DAYS]  # fmt: skip
        right = [i for i in range(44) if p.start[i] >= b
                 and 0.5 * (p.start[i] + p.end[i]) < b + WINDOW_DAYS]  # fmt: skip
        if min(sum(p.days[left]), sum(p.days[right])) >= MIN_DAYS_A_SIDE:
            by_hand.append((int(b), left, right))
    assert days.tolist() == [b for b, _, _ in by_hand]
    for row, (_, left, right) in zip(sides, by_hand, strict=True):
        assert np.flatnonzero(row == BEFORE).tolist() == left
        assert np.flatnonzero(row == AFTER).tolist() == right
    assert max(p.end[:44]) <= work.start


def test_many_boundaries_are_thinned_evenly() -> None:
    start = np.arange(0, 3000, 7, dtype=np.int32)
    mine = np.ones(start.shape[0], dtype=np.bool_)
    every, _ = invented_dates(start, start + 7, mine, most=10_000)
    some, sides = invented_dates(start, start + 7, mine, most=12)
    one, _ = invented_dates(start, start + 7, mine, most=1)
    assert len(some) == 12
    assert sides.shape == (12, start.shape[0])
    assert set(some.tolist()) < set(every.tolist())
    assert np.ptp(np.diff(some)) <= 7
    assert abs(int(one[0]) - 0.5 * (every[0] + every[-1])) <= 7


def placebo(bills: Bills, work: Work, *, occupied_since: int | None = None) -> Placebo:
    aligned = align(bills.periods, STATION)
    found = compare(aligned, work, year(), forms=GAS, occupied_since=occupied_since)
    return placebo_of(Asked(aligned, year(), GAS, 0.90), found.labels, work_start=work.start)


def test_too_short_a_baseline_says_how_much_longer_it_must_be() -> None:
    bills, work = house(12, 12, noise=0.05)
    found = placebo(bills, work)
    assert found.dates == ()
    assert found.share is None
    assert found.largest is None
    days = int(bills.periods.days[:12].sum())
    months = -(-(2 * MIN_DAYS_A_SIDE - days) // 30)
    assert f"{days} days of usable bills" in found.unavailable
    assert f"about {months} more months" in found.unavailable


def test_older_bills_of_the_same_occupant_take_part() -> None:
    """Bills too old for the answer serve the placebo; an earlier occupant's do not."""
    bills, work = house(44, 12, noise=0.05)
    found = placebo(bills, work)
    assert found.first == int(bills.periods.start[0])
    assert found.last == int(bills.periods.end[43])
    since = int(bills.periods.start[16])
    later = placebo(bills, work, occupied_since=since)
    assert later.first == since
    assert 0 < len(later.dates) < len(found.dates)


def test_nothing_after_the_work_takes_part() -> None:
    """Another use after the work leaves every invented date as it was."""
    bills, work = house(36, 14, noise=0.05)
    use = bills.periods.use.copy()
    use[36:] *= 3.0
    other = replace(bills, periods=replace(bills.periods, use=use))
    assert placebo(bills, work) == placebo(other, work)


def test_use_that_moved_before_the_work_earns_a_caution() -> None:
    """15 % less from the middle of the baseline on: most dates near it announce it."""
    bills, work = house(40, 14, noise=0.02)
    use = bills.periods.use.copy()
    use[20:40] *= 0.85
    moved = placebo(replace(bills, periods=replace(bills.periods, use=use)), work)
    assert moved.share is not None
    assert moved.share > MOST_ANNOUNCED
    told = moved_before(moved)
    assert len(told) == 1
    assert f"{len(moved.announced)} of {len(moved.dates)} invented work dates" in told[0]
    assert moved_before(placebo(bills, work)) == ()
    assert moved_before(None) == ()


def test_a_gap_that_leaves_no_date_is_called_a_gap() -> None:
    bills, work = house(20, 12, noise=0.05)
    p = bills.periods
    later = np.where(np.arange(p.n) < 13, 0, 1500).astype(np.int32)
    torn = replace(bills, periods=replace(p, start=p.start + later, end=p.end + later))
    found = placebo(torn, Work(work.start + 1500, work.end + 1500))
    assert int(p.days[:20].sum()) >= 2 * MIN_DAYS_A_SIDE
    assert found.dates == ()
    assert "have gaps" in found.unavailable


def test_an_account_that_gives_no_form_counts_no_date() -> None:
    """Winter alone shows no balance temperature; a flat load would not be believed."""
    homes = simulate(2, bills=24, rho=0.0, noise=0.05, seed=3, effect=0.0)
    batch = all_before(homes.batch)
    cold = replace(homes.table, temp=np.minimum(homes.table.temp, 30.0 + 0.01 * homes.table.temp))
    counts = placebo_counts(batch, cold, [homes.year])
    assert counts.dates.sum() == 0
    assert np.isnan(counts.largest).all()
