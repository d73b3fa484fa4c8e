"""Parts of the savings: exact sums, gradients, ranges that cover, and reasons where there are none.

Gradients are checked against numerical differentiation of the parts as written in docs/method.md
§7; the plain range against statsmodels' WLS; coverage against the truth that made the bills.
"""

from __future__ import annotations

import math
import os
from dataclasses import replace

import numpy as np
import pytest
import statsmodels.api as sm
from hypothesis import given, settings
from hypothesis import strategies as st
from numpy.typing import NDArray
from scipy import stats

from normalize.bills.periods import Periods
from normalize.fitting import forms as f
from normalize.fitting.align import Aligned, align
from normalize.fitting.columns import (
    AFTER,
    BASE,
    BEFORE,
    SLOPE_C,
    SLOPE_H,
    SLOPE_LINE,
    TAU_C,
    TAU_H,
    WIDTH,
)
from normalize.fitting.fit import side_data
from normalize.fitting.linear import linearise
from normalize.fitting.student import no_tables
from normalize.fitting.sweep import SHIFT_F
from normalize.savings.compare import Comparison, compare, run_batch
from normalize.savings.kernel import NORMALIZED
from normalize.savings.normal_year import nac_gradient, nac_of
from normalize.savings.parts import PARTS, READ_AS, parts_of, run_parts
from normalize.savings.parts_kernel import (
    FORMS_DIFFER,
    HELD,
    KNOWN,
    MOST_PARTS,
    NO_FIT,
    SLOPE_CHANGE,
    parts_about,
    parts_batch,
    take_apart,
)
from normalize.savings.sides import Work
from normalize.weather.temperature import DailyTemperature
from normalize.weather.year import LongTermYear, year_from_sample
from tests.fitting.accounts import weather
from tests.savings.homes import FIRST, WORK_DAYS, Homes, simulate
from tests.savings.test_batch import one_of

pytestmark = pytest.mark.kernel
HOMES = 60 if os.environ.get("NUMBA_BOUNDSCHECK") else 1000
WANTED = (0.87, 0.97)  # of a nominal 90 %: the project's own target


def some_year(seed: int = 1) -> LongTermYear:
    temp = weather(np.random.default_rng(seed), 3650, mean=55.0)
    return year_from_sample("ten years", temp, np.full(3650, 0.1))


YEAR = some_year()
FIELDS = {
    "flat": (BASE,),
    "line": (BASE, SLOPE_LINE),
    "heating": (BASE, SLOPE_H, TAU_H),
    "cooling": (BASE, SLOPE_C, TAU_C),
    "two slopes": (BASE, SLOPE_H, SLOPE_C, TAU_H),
    "heating and cooling": (BASE, SLOPE_H, SLOPE_C, TAU_H, TAU_C),
}


def row_of(form: str, theta: NDArray[np.float64]) -> NDArray[np.float64]:
    """θ in the order of the Jacobian: the line's level is at SHIFT_F; one τ for two slopes."""
    row = np.full(WIDTH, np.nan)
    for at, value in zip(FIELDS[form], theta, strict=True):
        row[at] = value
    if form == "line":
        row[BASE] = theta[0] - SHIFT_F * theta[1]
    if form == "two slopes":
        row[TAU_C] = row[TAU_H]
    return row


def written_out(form: str, one: NDArray[np.float64], two: NDArray[np.float64]) -> list[float]:
    """The parts as docs/method.md writes them, from the year's own degree-days."""
    parts = [365.0 * (one[0] - two[0])]
    if form == "line":
        return [*parts, (one[1] - two[1]) * 365.0 * (YEAR.mean_f - SHIFT_F)]
    slopes, balances = [], []
    loads = [YEAR.heating] if "heating" in form or form == "two slopes" else []
    loads += [YEAR.cooling] if "cooling" in form or form == "two slopes" else []
    for i, load in enumerate(loads):
        p = 1 + i
        q = 3 if form == "two slopes" else 1 + len(loads) + i
        first, second = load(float(one[q])), load(float(two[q]))
        slopes.append((one[p] - two[p]) * 0.5 * (first + second))
        balances.append(0.5 * (one[p] + two[p]) * (first - second))
    if form == "two slopes":
        balances = [sum(balances)]
    return [*parts, *slopes, *balances]


def about(
    form: str, one: NDArray[np.float64], two: NDArray[np.float64]
) -> tuple[NDArray[np.float64], NDArray[np.float64], NDArray[np.float64]]:
    code = f.form_named(form).code
    value, g1, g2 = parts_about(
        row_of(form, one), row_of(form, two), code, one.shape[0],
        YEAR.temp_f, YEAR.cum_days, YEAR.cum_degrees,
    )  # fmt: skip
    return value, g1, g2


def parameters(form: str, rng: np.random.Generator) -> NDArray[np.float64]:
    """Plausible parameters; τ between two observed temperatures, where the parts are smooth."""
    lows = {BASE: (0.2, 3.0), SLOPE_LINE: (-0.3, -0.01), SLOPE_H: (0.05, 1.0), SLOPE_C: (0.05, 1.0)}
    theta = []
    for at in FIELDS[form]:
        low, high = lows.get(at, (50.0, 62.0) if at == TAU_H else (64.0, 75.0))
        theta.append(rng.uniform(low, high))
    return np.array(theta)


@pytest.mark.parametrize("form", PARTS)
def test_every_gradient_is_the_derivative_of_its_part(form: str) -> None:
    """Central differences of the parts as the method writes them."""
    rng = np.random.default_rng(12)
    for _ in range(20):
        one, two = parameters(form, rng), parameters(form, rng)
        value, g1, g2 = about(form, one, two)
        assert value == pytest.approx(written_out(form, one, two), rel=1e-9, abs=1e-8)
        for j in range(one.shape[0]):
            step = np.zeros(one.shape[0])
            step[j] = 1e-6 * max(abs(one[j]), 0.01)
            ahead, behind = written_out(form, one + step, two), written_out(form, one - step, two)
            slope1 = (np.array(ahead) - behind) / (2 * step[j])
            ahead, behind = written_out(form, one, two + step), written_out(form, one, two - step)
            slope2 = (np.array(ahead) - behind) / (2 * step[j])
            assert g1[:, j] == pytest.approx(slope1, rel=1e-4, abs=1e-3)
            assert -g2[:, j] == pytest.approx(slope2, rel=1e-4, abs=1e-3)


@pytest.mark.parametrize("form", PARTS)
def test_drivers_stand_aside(form: str) -> None:
    """Columns of drivers lie between base load and slopes and have no part."""
    rng = np.random.default_rng(3)
    one, two = parameters(form, rng), parameters(form, rng)
    value, *plain = about(form, one, two)
    code, k = f.form_named(form).code, one.shape[0]
    wide, *more = parts_about(
        row_of(form, one), row_of(form, two), code, k + 2,
        YEAR.temp_f, YEAR.cum_days, YEAR.cum_degrees,
    )  # fmt: skip
    assert wide.tobytes() == value.tobytes()
    for gradient, wider in zip(plain, more, strict=True):
        assert not wider[:, 1:3].any()
        assert np.delete(wider, [1, 2], axis=1).tobytes() == gradient.tobytes()


@pytest.mark.parametrize("form", PARTS)
@given(seed=st.integers(0, 2**32 - 1))
@settings(max_examples=60, deadline=None)
def test_the_parts_and_their_gradients_add_up_exactly(form: str, seed: int) -> None:
    """An identity: parts to the difference of NAC, gradients to NAC's own."""
    rng = np.random.default_rng(seed)
    one, two = parameters(form, rng), parameters(form, rng)
    value, g1, g2 = about(form, one, two)
    code, k = f.form_named(form).code, one.shape[0]
    year = (YEAR.temp_f, YEAR.cum_days, YEAR.cum_degrees)
    nac = [nac_of(row_of(form, theta), code, *year) for theta in (one, two)]
    assert math.fsum(value) == pytest.approx(nac[0] - nac[1], abs=1e-11 * max(*nac, 1.0))
    for theta, gradient in ((one, g1), (two, g2)):
        whole = nac_gradient(row_of(form, theta), code, k, 0, *year)
        assert gradient.sum(axis=0) == pytest.approx(whole, rel=1e-12, abs=1e-9)


def truth_of(
    year: LongTermYear, one: tuple[float, ...], two: tuple[float, ...]
) -> NDArray[np.float64]:
    (a1, b1, t1), (a2, b2, t2) = one, two
    h1, h2 = year.heating(t1), year.heating(t2)
    return np.array([365 * (a1 - a2), (b1 - b2) * 0.5 * (h1 + h2), 0.5 * (b1 + b2) * (h1 - h2)])


def covered(
    found: NDArray[np.float64], truth: NDArray[np.float64], low: int, high: int
) -> NDArray[np.int64]:
    inside: NDArray[np.int64] = ((found[..., low] <= truth) & (truth <= found[..., high])).sum(0)
    return inside


def test_ranges_of_parts_cover_what_they_say() -> None:
    """24 bills a side, ρ = 0.3, 10 % noise: each part's 90 % range holds what made the bills."""
    homes = simulate(HOMES, bills=24, rho=0.3, noise=0.10, seed=31, effect=0.2)
    fits, chosen, answers = run_batch(homes.batch, homes.table, [homes.year], confidence=0.9)
    parts, slopes, why = run_parts(
        homes.batch, homes.table, [homes.year], fits, chosen, confidence=0.9
    )
    known = (why == KNOWN) & (chosen == f.HEATING).all(axis=1)
    n = int(known.sum())
    # The others: bills that place a balance temperature nowhere.  A binomial bound, since with
    # bounds checked only a few homes pass.
    assert n >= stats.binom.ppf(0.001, HOMES, 0.9)
    truth = truth_of(homes.year, (0.6, 0.12, 61.0), (0.6, 0.12 * 0.8, 61.0 - 0.8))
    assert truth.sum() == pytest.approx(homes.truth, rel=1e-9)
    inside = covered(parts[known, :3], truth, 1, 2)
    change = covered(slopes[known, SLOPE_CHANGE], np.array(0.12 * 0.2), 1, 2)
    # 99.9 % binomial bounds around the target band, so that chance alone rarely fails this.
    for count in (*inside, change):
        assert stats.binom.ppf(0.001, n, WANTED[0]) <= count <= stats.binom.ppf(0.999, n, WANTED[1])
    if HOMES >= 1000:  # the plain range takes bills as independent, and covers less
        assert (covered(parts[known, :3], truth, 3, 4) < inside).all()
    assert np.abs(parts[known, :3, 0].sum(axis=1) - answers[known, NORMALIZED]).max() < 1e-9
    width = np.median(parts[known, :3, 2] - parts[known, :3, 1], axis=0)
    whole = float(np.median(answers[known, NORMALIZED + 2] - answers[known, NORMALIZED + 1]))
    assert (width > whole).all()  # they err against each other: every part is less sure


def test_the_plain_range_is_the_delta_method() -> None:
    """Variance g'Σg on either side with Σ from statsmodels' WLS on the Jacobian; Welch's t."""
    homes = simulate(6, bills=18, rho=0.2, noise=0.08, seed=8)
    fits, chosen, _ = run_batch(homes.batch, homes.table, [homes.year], confidence=0.9)
    parts, _, why = run_parts(homes.batch, homes.table, [homes.year], fits, chosen, confidence=0.9)
    year = (homes.year.temp_f, homes.year.cum_days, homes.year.cum_degrees)
    for i in np.flatnonzero((why == KNOWN) & (chosen == f.HEATING).all(axis=1)):
        rows = [fits[i, side, f.HEATING] for side in (0, 1)]
        one = one_of(homes, int(i))
        value, *gradients = parts_about(rows[0], rows[1], f.HEATING, 3, *year)
        variance, freedom = [], []
        for side, gradient in enumerate(gradients):
            data = side_data(one, homes.table, side)
            jac, resid, held = linearise(
                rows[side], f.HEATING, data.ts, data.ps, data.y, data.d, data.w, False
            )
            assert not held
            ref = sm.WLS(resid, jac, weights=data.w).fit()
            cov = ref.cov_params()
            variance.append(np.einsum("jk,kl,jl->j", gradient, cov, gradient))
            freedom.append(ref.df_resid)
        v1, v2 = variance
        welch = (v1 + v2) ** 2 / (v1**2 / freedom[0] + v2**2 / freedom[1])
        half = stats.t.ppf(0.95, np.floor(welch)) * np.sqrt(v1 + v2)
        assert parts[i, :3, 4] - value == pytest.approx(half, rel=1e-6)
        assert value - parts[i, :3, 3] == pytest.approx(half, rel=1e-6)


def one_alone(homes: Homes, i: int) -> tuple[Aligned, Comparison]:
    one = one_of(homes, i)
    n = one.start.shape[0]
    temp = weather(np.random.default_rng(5), FIRST + 2 * 16 * 34 + WORK_DAYS + 3700, mean=50.0)
    periods = Periods(
        one.start.astype(np.int32), one.end.astype(np.int32), one.use, np.full(n, np.nan),
        np.zeros(n, bool), np.ones(n, np.int32),
    )  # fmt: skip
    aligned = align(periods, DailyTemperature("made up", 0, temp, np.zeros(temp.shape[0], bool)))
    before, after = one.side == BEFORE, one.side == AFTER
    work = Work.of((int(one.end[before].max()), int(one.start[after].min())))
    return aligned, compare(aligned, work, homes.year, forms=("flat", "heating"))


def test_an_account_alone_and_among_many_have_the_same_bits() -> None:
    homes = simulate(20, bills=14, rho=0.3, noise=0.1, seed=5)
    fits, chosen, _ = run_batch(homes.batch, homes.table, [homes.year], confidence=0.9)
    parts, slopes, why = run_parts(
        homes.batch, homes.table, [homes.year], fits, chosen, confidence=0.9
    )
    assert (why == KNOWN).sum() > 10
    for i in (0, 7, 13):
        aligned, found = one_alone(homes, i)
        alone = parts_of(aligned, found, homes.year, confidence=0.9)
        if why[i] != KNOWN:
            assert alone.unavailable
            continue
        assert found.savings.before is not None
        order = READ_AS.get(found.savings.before.form, tuple(range(MOST_PARTS)))
        for part, at in zip(alone.parts, order, strict=False):
            e = part.estimate
            told = np.array([e.value, e.low, e.high, e.plain_low, e.plain_high])
            assert told.tobytes() == parts[i, at].tobytes()
        for row, e in enumerate((alone.slope_before, alone.slope_after, alone.slope_change)):
            assert e is not None
            told = np.array([e.value, e.low, e.high, e.plain_low, e.plain_high])
            assert told.tobytes() == slopes[i, row].tobytes()
        assert alone.total == pytest.approx(found.savings.normalized.value, abs=1e-9)


def test_one_signature() -> None:
    """Coerced at one gate: a second dtype or layout would compile (and differ) anew."""
    homes = simulate(3, bills=12, rho=0.0, noise=0.1, seed=1)
    fits, chosen, _ = run_batch(homes.batch, homes.table, [homes.year], confidence=0.9)
    run_parts(homes.batch, homes.table, [homes.year], fits, chosen, confidence=0.9)
    other = replace(homes.batch, start=homes.batch.start.astype(np.int64))
    run_parts(
        other, homes.table, [homes.year], np.asfortranarray(fits), chosen.astype(np.int64),
        confidence=0.9,
    )  # fmt: skip
    assert len(parts_batch.signatures) == 1


def test_a_driver_known_to_the_fit_leaves_the_parts_alone() -> None:
    """An identity of least squares: use that grows with a regressor moves only its coefficient."""
    homes = simulate(12, bills=20, rho=0.2, noise=0.06, seed=21)
    driver = np.random.default_rng(9).uniform(-1.0, 1.0, homes.batch.use.shape[0])
    days = homes.batch.end - homes.batch.start
    found = []
    for more in (0.0, 1.7):
        use = homes.batch.use + more * driver * days
        batch = replace(homes.batch, use=use, drivers=driver[:, None])
        fits, chosen, answers = run_batch(batch, homes.table, [homes.year], confidence=0.9)
        parts, _, why = run_parts(batch, homes.table, [homes.year], fits, chosen, confidence=0.9)
        found.append((parts, why, answers[:, NORMALIZED]))
    (parts, why, whole), (moved, why_moved, _) = found
    same = (why == KNOWN) & (why_moved == KNOWN)
    assert same.sum() > 6
    assert parts[same, :3, 0].sum(axis=1) == pytest.approx(whole[same], abs=1e-8)
    for column in (0, 3, 4):  # the value and the plain range
        assert moved[same, :3, column] == pytest.approx(parts[same, :3, column], rel=1e-6, abs=1e-5)


def side_arrays(homes: Homes, i: int, code: int) -> tuple[object, ...]:
    d = side_data(one_of(homes, i), homes.table, code)
    return (d.ts, d.ps, d.y, d.d, d.w, d.start, d.end)


def test_there_are_no_parts_where_a_split_would_be_an_artefact() -> None:
    homes = simulate(1, bills=18, rho=0.0, noise=0.05, seed=2)
    fits, chosen, _ = run_batch(homes.batch, homes.table, [homes.year], confidence=0.9)
    assert (chosen == f.HEATING).all()
    year = (homes.year.temp_f, homes.year.cum_days, homes.year.cum_degrees)
    sides = side_arrays(homes, 0, 0), side_arrays(homes, 0, 1)
    none = tuple(np.empty((len(side[2]), 0)) for side in sides)  # type: ignore[arg-type]

    def why(form2: int, hold: bool = False) -> tuple[int, NDArray[np.float64], NDArray[np.float64]]:
        parts, slopes = np.full((MOST_PARTS, 5), np.nan), np.full((3, 5), np.nan)
        found = take_apart(
            parts, slopes, fits[0, 0, f.HEATING], chosen[0, 0], sides[0], none[0],
            fits[0, 1, max(form2, 0)], np.int8(form2), sides[1], none[1], year, hold, 0.9,
            no_tables(),
        )  # fmt: skip
        return int(found), parts, slopes

    reason, parts, slopes = why(f.FLAT)
    assert reason == FORMS_DIFFER
    assert np.isnan(parts).all()
    assert np.isfinite(slopes[0]).all()
    assert np.isnan(slopes[1:]).all()
    reason, parts, slopes = why(f.HEATING, hold=True)
    assert reason == HELD
    assert np.isnan(parts).all()
    assert np.isnan(slopes).all()  # a slope at a stated balance temperature looks too sure
    reason, parts, slopes = why(-1)
    assert reason == NO_FIT
    assert np.isfinite(slopes[0]).all()
    reason, parts, _ = why(f.HEATING)
    assert reason == KNOWN
    assert np.isfinite(parts[:3]).all()


def test_the_reason_is_told_in_words() -> None:
    homes = simulate(20, bills=14, rho=0.3, noise=0.1, seed=5)
    aligned, found = one_alone(homes, 7)
    stated = replace(found, stated_f=60.0)
    told = parts_of(aligned, stated, homes.year, confidence=0.9)
    assert told.parts == ()
    assert "stated (60 °F)" in (told.unavailable or "")
    none = replace(found, savings=replace(found.savings, before=None, before_unavailable="few"))
    assert parts_of(aligned, none, homes.year, confidence=0.9).unavailable == "few"
