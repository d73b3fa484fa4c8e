"""How small a saving would show: parts of the plan against the kernels, dense algebra, homes.

The kernels are the program's own ranges; dense algebra and finite differences share no code
with the plan.  Simulated homes: docs/evidence-plan.md has 1,000 a cell, here a few.
"""

from __future__ import annotations

from dataclasses import replace

import numpy as np
import pytest

from normalize.bills.periods import Periods
from normalize.fitting.align import align
from normalize.fitting.correlation import through_rho
from normalize.fitting.results import Fit
from normalize.fitting.rho import RHO
from normalize.savings.compare import compare
from normalize.savings.planning import (
    LIKELY,
    Ahead,
    Baseline,
    Prospect,
    Smallest,
    _ahead,
    _gradient,
    _groups,
    _Later,
    needed,
    prospects,
)
from normalize.savings.sides import Work
from tests.savings.plan_homes import shows
from tests.savings.test_answers import STATION, TEMP, house, year

pytestmark = pytest.mark.kernel
FORMS = ("flat", "heating")


def baseline(n: int = 24, noise: float = 0.08) -> tuple[Baseline, Work, Periods]:
    bills, work = house(n, 0, noise=noise)
    aligned = align(bills.periods, STATION)
    found = compare(aligned, work, year(), forms=FORMS)
    assert found.savings.before is not None
    mine = np.arange(n)
    held = found.held[0]
    return Baseline.of(aligned, mine, found.savings.before, held=held), work, bills.periods


def ahead(work: Work, n: int, length: int = 30) -> Ahead:
    temp = TEMP[work.end : work.end + n * length]
    return Ahead(work.end, length, temp[None, :], (2001,))


@pytest.mark.parametrize("n", [3, 8, 14])
def test_the_reach_of_avoided_use_is_that_of_the_range(n: int) -> None:
    """With the weather that came, the same quantiles as the kernel's range of avoided use."""
    base, work, periods = baseline()
    came = ahead(work, n)
    start = work.end + 30 * np.arange(n)
    use = np.full(n, 40.0)
    both = Periods(
        np.append(periods.start, start).astype(np.int32),
        np.append(periods.end, start + 30).astype(np.int32),
        np.append(periods.use, use), np.full(24 + n, np.nan), np.zeros(24 + n, bool),
        np.ones(24 + n, np.int32),
    )  # fmt: skip
    lows = [
        compare(align(both, STATION), work, year(), forms=FORMS, confidence=c).savings.avoided.low
        for c in (0.5, 0.9)
    ]
    evens = [
        prospects(base, came, year(), confidence=c, counts=(n,))[0].avoided.even for c in (0.5, 0.9)
    ]
    assert lows[0] is not None
    assert lows[1] is not None
    assert evens[1] - evens[0] == pytest.approx(lows[0] - lows[1], rel=1e-6)


def test_a_like_fit_after_the_work_has_the_variance_that_the_kernel_gives() -> None:
    base, work, _ = baseline()
    _, jac = _ahead(base.fit, ahead(work, 12), held=base.held)
    gradient = _gradient(base.fit, year(), held=base.held)
    g = gradient[None, :]
    later = _Later.of(jac, gradient)
    resid = np.random.default_rng(3).normal(size=12)
    like, _, scale2, innovation = through_rho(jac, resid, np.full(12, 30.0), np.arange(12.0), g)
    size2 = scale2[:, 0] / innovation
    assert later.unit2 == pytest.approx(size2, rel=1e-6)
    spare = 12 - jac.shape[1]
    level = like + 0.5 * spare * np.log(innovation * spare)
    assert later.level - later.level[0] == pytest.approx(level - level[0], abs=1e-6)


def test_the_expected_residuals_by_dense_algebra() -> None:
    """tr(M_ρ V*), M = V⁻¹ − V⁻¹X(X'V⁻¹X)⁻¹X'V⁻¹, with V inverted as a dense matrix."""
    base, work, _ = baseline()
    _, jac = _ahead(base.fit, ahead(work, 10), held=base.held)
    later = _Later.of(jac, np.ones(jac.shape[1]))
    apart = np.abs(np.subtract.outer(np.arange(10), np.arange(10)))

    def v(rho: float) -> np.ndarray:
        return rho**apart / (1 - rho * rho)

    for true in (0, 8, 15, 26):
        found = later.trace(true)
        for at in (0, 5, 8, 20, 26):
            inverse = np.linalg.inv(v(RHO[at]))
            hat = inverse @ jac @ np.linalg.inv(jac.T @ inverse @ jac) @ jac.T @ inverse
            assert found[at] == pytest.approx(np.trace((inverse - hat) @ v(RHO[true])), rel=1e-6)
        assert found[true] == pytest.approx(10 - jac.shape[1], rel=1e-9)


@pytest.mark.parametrize("form", ["heating", "cooling", "heating and cooling", "line", "flat"])
def test_the_gradient_of_nac_by_finite_differences(form: str) -> None:
    base, _, _ = baseline()
    heats, cools = "heating" in form, "cooling" in form
    fit = replace(
        base.fit, form=form, base_load=2.0, line_slope=-0.1 if form == "line" else None,
        heating_slope=0.12 if heats else None, balance_heating_f=58.03 if heats else None,
        cooling_slope=0.2 if cools else None, balance_cooling_f=66.04 if cools else None,
    )  # fmt: skip
    names = ["base_load"]
    names += ["line_slope"] if form == "line" else []
    names += ["heating_slope"] if heats else []
    names += ["cooling_slope"] if cools else []
    names += ["balance_heating_f"] if heats else []
    names += ["balance_cooling_f"] if cools else []
    found = _gradient(fit, year(), held=False)
    assert found.shape == (len(names),)
    for at, name in enumerate(names):
        up, down = (moved(fit, name, step).nac(year()) for step in (1e-5, -1e-5))
        slope = (up - down) / 2e-5
        if name == "line_slope":  # the plan takes the line about its middle temperature
            slope -= 365 * 60.0
        assert found[at] == pytest.approx(slope, rel=1e-3, abs=1e-3)


def moved(fit: Fit, name: str, step: float) -> Fit:
    value = getattr(fit, name)
    return replace(fit, **{name: value + step})


def test_whole_years_more_never_need_a_larger_saving() -> None:
    base, work, _ = baseline()
    found = prospects(base, ahead(work, 36), year(), counts=(12, 24, 36))
    likely = [p.normalized.likely for p in found if p.normalized is not None]
    assert len(likely) == 3
    assert likely == sorted(likely, reverse=True)
    for p in found:
        assert p.avoided.even < p.avoided.likely
        assert p.avoided.over > 0


def test_a_normal_year_needs_what_an_answer_needs() -> None:
    base, work, _ = baseline()
    found = prospects(base, ahead(work, 12), year(), counts=(3, 5, 8, 9))
    told = {p.bills: p.unavailable for p in found}
    assert "6 bills" in told[3]
    assert "6 bills" in told[5]
    assert "270 days" in told[8]
    assert told[9] == ""
    assert all(p.avoided.likely > 0 for p in found)
    without = prospects(base, ahead(work, 12), None, counts=(12,))
    assert without[0].normalized is None
    assert "no long-term year" in without[0].unavailable


def test_more_confidence_needs_more_and_twice_the_same() -> None:
    base, work, _ = baseline()
    loose, tight = (
        prospects(base, ahead(work, 12), year(), confidence=c, counts=(12,)) for c in (0.8, 0.95)
    )
    assert loose[0].avoided.even < tight[0].avoided.even
    assert prospects(base, ahead(work, 12), year(), confidence=0.8, counts=(12,)) == loose


def test_groups_of_correlation_keep_all_the_weight() -> None:
    weight = np.zeros(27)
    weight[[4, 5, 6, 20]] = (0.2, 0.3, 0.4995, 0.0005)
    found = _groups(weight)
    assert [at for at, _ in found] == [5, 6]
    assert [share for _, share in found] == pytest.approx([0.5 / 0.9995, 0.4995 / 0.9995])


def test_the_first_count_that_is_enough() -> None:
    rows = [
        Prospect(n, 100 * n, Smallest(20.0 / n, 40.0 / n, 100.0), None, "too few")
        for n in (3, 4, 5, 6)
    ]
    one = needed(rows, 0.08, odds=LIKELY, normalized=False)
    assert one is not None
    assert one.bills == 5
    assert needed(rows, 0.08, odds=LIKELY, normalized=True) is None
    assert needed(rows, 0.01, odds=0.5, normalized=False) is None


def test_homes_that_save_the_smallest_saving_show_it_as_often_as_promised() -> None:
    """120 homes: within four Monte Carlo errors of 0.50 and 0.80 (docs/evidence-plan.md)."""
    found = shows(120, before=24, after=12, rho=0.0, seed=77)
    assert len(found) == 4
    for (_, odds), (share, homes, _) in found.items():
        promised = 0.5 if odds == "even" else 0.8
        assert abs(share - promised) < 4 * np.sqrt(promised * (1 - promised) / homes)
