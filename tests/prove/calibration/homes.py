"""The homes of a cell, simulated all at once: bills, weather, and what is true of them."""

from __future__ import annotations

from dataclasses import dataclass

import numpy as np
from numpy.typing import NDArray

from normalize.fitting.batch import Batch, Stations, stations, wanted_mask
from normalize.fitting.columns import AFTER, BEFORE
from normalize.weather.year import LongTermYear
from tests.prove.calibration.cells import Cell
from tests.prove.calibration.climates import PAST_DAYS, Station, seasons_of, stations_of
from tests.prove.calibration.errors import errors
from tests.prove.calibration.loads import MEAN_USE, MOST_EFFECT, Array, Loads, draw

WORK_DAYS = 31  # of work between the two sides
ESTIMATED_SHARE = 1.0 / 6.0
DELIVERY_SPREAD = (0.6, 1.4)  # of an ordinary delivery
LENGTHS = {"monthly": (28, 34), "two-monthly": (57, 66), "daily": (1, 2)}  # days, half-open

Days = NDArray[np.int64]


@dataclass(frozen=True)
class Homes:
    """Simulated homes with the truth.

    home (rows,) whose each bill is; expected, without (rows,) what the bill would be without
    its error, and without the work too.  nac (homes, 2) true NAC before and after.
    """

    cell: Cell
    batch: Batch
    table: Stations
    years: list[LongTermYear]
    home: Days
    expected: Array
    without: Array
    nac: Array

    @property
    def avoided(self) -> Array:
        """(homes,) true avoided use: what the work took from the expected use of the bills."""
        after = np.asarray(self.batch.side) == AFTER
        gone = np.where(after, self.without - self.expected, 0.0)
        return np.bincount(self.home, gone, minlength=self.nac.shape[0])


def simulate(cell: Cell, homes: int, *, placebo: bool = False) -> Homes:
    """Homes of a cell; placebo : nothing was done to them.

    Homes are spread over the climate's stations and begin on any day of a year.
    """
    rng = np.random.default_rng((cell.seed, int(placebo)))
    sites = stations_of(cell.climate)
    station = np.arange(homes) % len(sites)
    before = draw(rng, cell.form, sites, station, seasons_of(cell.climate))
    effect = np.zeros(homes) if placebo else rng.uniform(0.0, MOST_EFFECT, homes)
    after = before.after(effect, cell.form)
    first = PAST_DAYS + rng.integers(0, 365, homes)
    if cell.schedule == "delivered":
        start, end, side, home, place = _deliveries(rng, cell, sites, station, first, before, after)
    else:
        start, end, side, home, place = _readings(rng, cell, first)
    expected, without = _expected(sites, station, start, end, side, home, before, after)
    error = errors(rng, cell, homes, int(place.max()) + 1)[home, place]
    use = expected + error * _scale(cell, end - start, expected)
    if cell.folded:
        start, end, side, home, (use, expected, without) = _fold(
            rng, start, end, side, home, (use, expected, without)
        )
    years = [s.year for s in sites]
    batch = Batch(
        start=start,
        end=end,
        use=use,
        side=side,
        offsets=np.concatenate([[0], np.cumsum(np.bincount(home, minlength=homes))]),
        station=station,
        wanted=np.tile(wanted_mask(cell.offered), (homes, 1)),
        net=np.zeros(homes, bool),
    )
    table = stations([(0, s.temp_f) for s in sites], int(start.min()), int(end.max()))
    nac = np.stack([before.nac(years, station), after.nac(years, station)], axis=1)
    return Homes(cell, batch, table, years, home, expected, without, nac)


def _readings(
    rng: np.random.Generator, cell: Cell, first: Days
) -> tuple[Days, Days, NDArray[np.uint8], Days, Days]:
    """Meters read on a route: start, end, side, home and place in the run of errors."""
    homes, n = first.shape[0], cell.bills
    low, high = LENGTHS[cell.schedule]
    length = rng.integers(low, high, (homes, 2 * n))
    end = first[:, None] + np.cumsum(length, axis=1)
    end[:, n:] += WORK_DAYS
    start = end - length
    side = np.tile(np.repeat(np.array([BEFORE, AFTER], np.uint8), n), homes)
    home = np.repeat(np.arange(homes), 2 * n)
    steps = np.arange(2 * n)
    steps[n:] += max(round(WORK_DAYS / cell.typical_days), 1)
    return start.ravel(), end.ravel(), side, home, np.tile(steps, homes)


def _deliveries(
    rng: np.random.Generator, cell: Cell, sites: tuple[Station, ...], station: Days, first: Days,
    before: Loads, after: Loads,
) -> tuple[Days, Days, NDArray[np.uint8], Days, Days]:  # fmt: skip
    """Tanks filled when so much has been used: short intervals in winter, long in summer."""
    homes, n = first.shape[0], cell.bills
    drawn = 365.0 * MEAN_USE / cell.a_year * rng.uniform(*DELIVERY_SPREAD, (homes, 2 * n))
    until = int(2.4 * n * 365 / cell.a_year) + 800
    temp = _temperatures(sites, station, first, until)
    total = [np.cumsum(load.use(temp), axis=1) for load in (before, after)]
    edges = np.empty((homes, 2, n + 1), np.int64)
    for h in range(homes):
        at = 0
        for which in range(2):
            used = total[which][h]
            opening = used[at - 1] if at else 0.0
            full = opening + np.cumsum(drawn[h, which * n : which * n + n])
            edges[h, which, 0] = at
            edges[h, which, 1:] = np.searchsorted(used, full) + 1
            at = int(edges[h, which, -1]) + WORK_DAYS
    if edges.max() >= until:
        raise ValueError(f"the record of {until} days is too short for {cell}")
    start = (first[:, None, None] + edges[:, :, :-1]).reshape(homes, -1)
    end = (first[:, None, None] + edges[:, :, 1:]).reshape(homes, -1)
    side = np.tile(np.repeat(np.array([BEFORE, AFTER], np.uint8), n), homes)
    steps = np.arange(2 * n)
    steps[n:] += 1
    home = np.repeat(np.arange(homes), 2 * n)
    return start.ravel(), end.ravel(), side, home, np.tile(steps, homes)


def _temperatures(
    sites: tuple[Station, ...], station: Days, first: Days, days: int
) -> NDArray[np.float64]:
    """(homes, days) from each home's first day on."""
    series = np.stack([s.temp_f for s in sites])
    if int(first.max()) + days > series.shape[1]:
        raise ValueError(f"{days} days from day {first.max()} leave the weather record")
    return series[station[:, None], first[:, None] + np.arange(days)[None, :]]


def _expected(
    sites: tuple[Station, ...], station: Days, start: Days, end: Days,
    side: NDArray[np.uint8], home: Days, before: Loads, after: Loads,
) -> tuple[Array, Array]:  # fmt: skip
    """(rows,) expected use of each bill, and what it would be without the work."""
    homes = station.shape[0]
    first = np.full(homes, start.max())
    np.minimum.at(first, home, start)
    temp = _temperatures(sites, station, first, int((end - first[home]).max()))
    sums = []
    for load in (before, after):
        total = np.zeros((homes, temp.shape[1] + 1))
        np.cumsum(load.use(temp), axis=1, out=total[:, 1:])
        sums.append(total[home, end - first[home]] - total[home, start - first[home]])
    return np.where(side == AFTER, sums[1], sums[0]), sums[0]


def _scale(cell: Cell, days: Days, expected: Array) -> Array:
    """(rows,) standard deviation of the error of each bill's use."""
    if cell.spread == "use":
        return cell.noise * expected
    if cell.spread == "equal":
        return cell.noise * MEAN_USE * days
    return cell.noise * MEAN_USE * np.sqrt(days * cell.typical_days)


def _fold(
    rng: np.random.Generator, start: Days, end: Days, side: NDArray[np.uint8], home: Days,
    sums: tuple[Array, ...],
) -> tuple[Days, Days, NDArray[np.uint8], Days, tuple[Array, ...]]:  # fmt: skip
    """One bill in six is an estimate and is joined to the next; the last of a side never is."""
    joins = rng.random(start.shape[0]) < ESTIMATED_SHARE
    joins[:-1] &= (home[1:] == home[:-1]) & (side[1:] == side[:-1])
    joins[-1] = False
    opens = np.concatenate([[True], ~joins[:-1]])
    at = np.flatnonzero(opens)
    last = np.concatenate([at[1:], [start.shape[0]]]) - 1
    return start[at], end[last], side[at], home[at], tuple(np.add.reduceat(s, at) for s in sums)
