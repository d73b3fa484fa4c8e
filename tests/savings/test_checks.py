"""Checks: their numbers against statsmodels, their words, and what a miss asks for."""

from __future__ import annotations

from dataclasses import replace

import numpy as np
import pytest
import statsmodels.api as sm
from statsmodels.stats.diagnostic import acorr_ljungbox
from statsmodels.stats.stattools import durbin_watson

from normalize.bills.periods import Bills, Periods
from normalize.days import iso
from normalize.fitting.align import Aligned, align
from normalize.fitting.results import Fit
from normalize.savings.again import Asked
from normalize.savings.alike import alike, chi_square_tail
from normalize.savings.checks import MOST_ANNOUNCED, checks_of
from normalize.savings.compare import Comparison, compare
from normalize.savings.evidence import SideEvidence, days_of, evidence_of, jacobian_of
from normalize.savings.extrapolation import extrapolation_of
from normalize.savings.guideline import effective_bills, fractional_uncertainty, k_of_months
from normalize.savings.influence import weigh
from normalize.savings.results import Check
from normalize.savings.scrutiny import scrutinise
from normalize.savings.sides import Work
from normalize.weather.temperature import DailyTemperature
from normalize.weather.year import year_from_sample
from tests.savings.test_answers import STATION, TEMP, house, year

pytestmark = pytest.mark.kernel
GAS = ("flat", "heating")


def assessed(
    bills: Bills, work: Work, *, forms: tuple[str, ...] = GAS, station: DailyTemperature = STATION
) -> tuple[Aligned, Comparison, tuple[Check, ...]]:
    aligned = align(bills.periods, station)
    found = compare(aligned, work, year(), forms=forms)
    asked = Asked(aligned, year(), forms, 0.90)
    close = scrutinise(asked, found, work_start=work.start)
    n_after = found.labels.count("after")
    checks = checks_of(
        found.savings, close.evidence, n_after=n_after, without=close.without, placebo=close.placebo
    )
    return aligned, found, checks


def side_of(
    aligned: Aligned, found: Comparison, which: str
) -> tuple[Fit, np.ndarray, np.ndarray, np.ndarray, np.ndarray]:
    """Fit, design at fixed τ, design with τ, use per day and weights of a side."""
    mine = np.flatnonzero(np.array(found.labels) == which)
    fit = found.savings.before if which == "before" else found.savings.after
    assert fit is not None
    days, owner = days_of(aligned, mine)
    d = aligned.days[mine].astype(float)
    x = jacobian_of(fit, days, owner, d, with_tau=False)
    return fit, x, jacobian_of(fit, days, owner, d, with_tau=True), aligned.use[mine] / d, d


def scaled(y: np.ndarray, x: np.ndarray, w: np.ndarray) -> sm.regression.linear_model.OLSResults:
    root = np.sqrt(w)
    return sm.OLS(y * root, x * root[:, None]).fit()


@pytest.mark.parametrize("which", ["before", "after"])
def test_weight_of_each_bill_is_that_of_statsmodels_at_fixed_tau(which: str) -> None:
    """Leverage, Cook's distance, DFFITS: statsmodels 0.15, OLS on rows times √w = its WLS."""
    bills, work = house(24, 18, noise=0.08)
    aligned, found, _ = assessed(bills, work)
    fit, x, _, y, w = side_of(aligned, found, which)
    assert fit.heating_slope is not None
    ours = weigh(x, y - x @ np.array([fit.base_load, fit.heating_slope]), w)
    model = scaled(y, x, w)
    assert model.params == pytest.approx(sm.WLS(y, x, weights=w).fit().params, rel=1e-10)
    theirs = model.get_influence()
    assert [b.leverage for b in ours] == pytest.approx(theirs.hat_matrix_diag, rel=1e-10)
    assert [b.cook for b in ours] == pytest.approx(theirs.cooks_distance[0], rel=1e-8)
    assert [b.dffits for b in ours] == pytest.approx(theirs.dffits[0], rel=1e-8)


def test_with_the_column_of_tau_it_is_still_that_of_statsmodels() -> None:
    """Against a regression on all columns of the Jacobian, of use that it fits as the fit does."""
    bills, work = house(24, 18, noise=0.08)
    aligned, found, _ = assessed(bills, work)
    _, _, jac, y, w = side_of(aligned, found, "before")
    model = scaled(y, jac, w)
    theirs = model.get_influence()
    ours = weigh(jac, model.resid / np.sqrt(w), w)
    assert [b.leverage for b in ours] == pytest.approx(theirs.hat_matrix_diag, rel=1e-10)
    assert [b.cook for b in ours] == pytest.approx(theirs.cooks_distance[0], rel=1e-8)
    evidence = evidence_of(aligned, found, year())[0]
    assert [b.leverage for b in evidence.weights] == pytest.approx(
        theirs.hat_matrix_diag, rel=1e-10
    )
    assert sum(b.leverage for b in evidence.weights) == pytest.approx(3.0)  # a, b and τ


@pytest.mark.parametrize("form", ["heating", "cooling", "two slopes", "line"])
def test_the_jacobian_is_the_derivative_of_the_prediction(form: str) -> None:
    """By differences of Fit.predict, at temperatures none of which is τ itself."""
    base = {"base_load": 2.0, "form": form, "balance_heating_f": None, "balance_cooling_f": None,
            "heating_slope": None, "cooling_slope": None, "line_slope": None}  # fmt: skip
    names = ["base_load"]
    if form == "line":
        base["line_slope"] = -0.03
        names.append("line_slope")
    if form in ("heating", "two slopes"):
        base |= {"heating_slope": 0.11, "balance_heating_f": 60.05}
        names.append("heating_slope")
    if form in ("cooling", "two slopes"):
        base |= {"cooling_slope": 0.07, "balance_cooling_f": 60.05}
        names.append("cooling_slope")
    made = Fit(
        **base, n_periods=3, n_days=90, rss=0, r2=0, cv_rmse=0, bias=0, terms=(), se=(),
        se_full=None, t=(), aicc=0, bic=0, mean_use=2.0,
    )  # fmt: skip
    days = np.round(TEMP[300:390], 1)
    owner = np.repeat([0, 1, 2], 30)

    def use(fit: Fit) -> np.ndarray:
        return np.bincount(owner, fit.predict(days)) / 30.0

    jac = jacobian_of(made, days, owner, np.full(3, 30.0), with_tau=form != "line")
    step = 1e-4
    for column, name in enumerate(names):
        up = replace(made, **{name: base[name] + step})
        slope = (use(up) - use(made)) / step
        if name == "line_slope":
            slope = slope - 60.0  # the column is taken about 60 °F
        assert jac[:, column] == pytest.approx(slope, rel=1e-6, abs=1e-8)
    if form != "line":
        taus = {k: 60.05 + step for k in ("balance_heating_f", "balance_cooling_f") if base[k]}
        moved = (use(replace(made, **taus)) - use(made)) / step
        assert jac[:, len(names)] == pytest.approx(moved, rel=1e-6, abs=1e-8)


def test_errors_alike_are_judged_as_statsmodels_does() -> None:
    """Durbin–Watson, lag-1 correlation and Ljung–Box: statsmodels 0.15."""
    bills, work = house(24, 18, noise=0.08)
    aligned, found, _ = assessed(bills, work)
    fit, x, _, y, w = side_of(aligned, found, "before")
    e = (y - x @ np.array([fit.base_load, fit.heating_slope])) * np.sqrt(w)
    ours = alike(e)
    assert ours is not None
    theirs = acorr_ljungbox(e, lags=[ours.lags], return_df=True)
    assert ours.q == pytest.approx(float(theirs["lb_stat"].iloc[0]), rel=1e-10)
    assert ours.p == pytest.approx(float(theirs["lb_pvalue"].iloc[0]), rel=1e-9)
    assert ours.lag1 == pytest.approx(sm.tsa.acf(e, nlags=1)[1], rel=1e-10)
    assert fit.durbin_watson == pytest.approx(durbin_watson(e), rel=1e-10)
    evidence = evidence_of(aligned, found, year())[0]
    assert evidence.alike is not None
    assert evidence.alike.q == pytest.approx(ours.q, rel=1e-9)


def test_the_tail_of_chi_square_is_scipys() -> None:
    from scipy.stats import chi2

    for df in range(1, 11):
        for x in (0.0, 0.01, 1.0, 5.0, 20.0, 60.0):
            assert chi_square_tail(x, df) == pytest.approx(chi2.sf(x, df), rel=1e-12)


def test_nothing_is_said_of_errors_that_are_not_there() -> None:
    assert alike(np.zeros(24)) is None
    assert alike(np.ones(4)) is None


def test_k_by_months_and_effective_bills() -> None:
    """k of Sun & Baltazar 2013 (memory) computed by hand; n′ of Reddy & Claridge 2000."""
    assert k_of_months(12) == pytest.approx(-0.00022 * 144 + 0.03306 * 12 + 0.94054, abs=1e-12)
    assert k_of_months(12) == pytest.approx(1.30558, abs=1e-9)
    assert effective_bills(12, 0.0) == 12.0
    assert effective_bills(12, 0.5) == pytest.approx(4.0)
    given = {"n": 12, "m": 12, "rho": 0.0, "cv": 0.1, "fraction": 0.1, "t": 1.0}
    ratio = fractional_uncertainty(**given, k=k_of_months(12)) / fractional_uncertainty(**given)
    assert ratio == pytest.approx(1.30558 / 1.26, rel=1e-9)


def test_a_year_that_was_seen_is_not_extrapolated() -> None:
    bills, work = house(24, 18, noise=0.05)
    _, found, _ = assessed(bills, work)
    fit = found.savings.before
    assert fit is not None
    inside = extrapolation_of(fit, year(), np.array([TEMP.min(), TEMP.max()]))
    assert inside is not None
    assert (inside.days, inside.heating, inside.cooling) == (0.0, 0.0, None)
    mild = extrapolation_of(fit, year(), np.array([55.0, 56.0]))
    assert mild is not None
    assert mild.heating is not None
    tau = fit.balance_heating_f
    seen = (TEMP >= 55.0) & (TEMP <= 56.0)
    by_hand = np.maximum(tau - TEMP[~seen], 0).sum() / np.maximum(tau - TEMP, 0).sum()
    assert mild.heating == pytest.approx(by_hand, rel=1e-12)
    assert mild.days == pytest.approx((~seen).mean(), rel=1e-12)
    assert extrapolation_of(fit, year(), np.empty(0)) is None


def named(checks: tuple[Check, ...], name: str, side: str = "before") -> Check:
    return next(c for c in checks if c.name == name and c.side == side)


def test_every_check_speaks_and_none_looks_at_r2() -> None:
    bills, work = house(24, 18, noise=0.05)
    _, _, checks = assessed(bills, work)
    for check in checks:
        assert check.means
        assert check.source
        assert "R²" not in check.name
        assert check.do or check.meets is not False
    assert {"CV(RMSE)", "days of bills", "temperatures seen", "heating degree-days not seen",
            "|t| of the heating slope", "bills err independently, p", "influence of single bills",
            "balance temperature for heating well placed"} <= {c.name for c in checks}  # fmt: skip
    both = {c.name for c in checks if c.side == "both"}
    assert {"fractional savings uncertainty at 68 %", "answer without any one bill"} <= both
    assert "change in standard errors" in both


def test_a_flat_load_of_no_r2_misses_nothing() -> None:
    """R² is 0 and the fit is as good as one can be."""
    bills, work = house(24, 18, slope=0.0, noise=0.02)
    _, found, checks = assessed(bills, work)
    assert found.savings.before is not None
    assert found.savings.before.form == "flat"
    assert found.savings.before.r2 == pytest.approx(0.0, abs=1e-12)
    assert [c.name for c in checks if c.meets is False] == []


def with_use(bills: Bills, at: int, factor: float) -> Bills:
    use = bills.periods.use.copy()
    use[at] *= factor
    return replace(bills, periods=replace(bills.periods, use=use))


def test_a_wild_bill_is_named_by_its_dates_and_stays_in() -> None:
    bills, work = house(24, 18, noise=0.03)
    cold = int(np.argmax(bills.periods.use[:24] / bills.periods.days[:24]))
    wild = with_use(bills, cold, 2.5)
    aligned, found, checks = assessed(wild, work)
    assert found.savings.before is not None
    assert found.savings.before.n_periods == 24
    start, end = iso(int(aligned.start[cold])), iso(int(aligned.end[cold]))
    pull = named(checks, "influence of single bills")
    assert pull.meets is False
    assert f"the bill from {start} until {end}" in pull.means
    assert "stays in" in pull.do
    moved = named(checks, "answer without any one bill", "both")
    assert f"the bill from {start} until {end}" in moved.means
    assert "instead of" in moved.means
    assert moved.value is not None
    assert (
        moved.value > named(assessed(bills, work)[2], "answer without any one bill", "both").value
    )


def test_a_finding_that_rests_on_one_bill_is_called_so() -> None:
    """One bill at half use carries the whole saving: without it nothing is told from zero."""
    bills, work = house(24, 12, effect=0.05, noise=0.02)
    turned = None
    for factor in (0.9, 0.8, 0.7, 0.6, 0.5, 0.4):
        for at in range(24, 36):
            made = with_use(bills, at, factor)
            check = named(assessed(made, work)[2], "answer without any one bill", "both")
            if "rests on few bills" in check.means:
                turned = check
                break
        if turned:
            break
    assert turned is not None
    assert turned.meets is False


def test_an_increase_has_its_uncertainty_too() -> None:
    bills, work = house(24, 18, effect=-0.3, noise=0.02)
    _, _, checks = assessed(bills, work)
    fsu = named(checks, "fractional savings uncertainty at 68 %", "both")
    assert fsu.value is not None
    assert 0.0 < fsu.value < 0.5


def test_a_mild_baseline_misses_degree_days_not_seen() -> None:
    """A baseline that saw no day below 40 °F, normalized to a year that has many."""
    warm = np.maximum(TEMP, 40.0 + 0.001 * (TEMP - TEMP.min()))
    station = DailyTemperature("warm", 0, warm, np.zeros(3000, bool))
    bills, work = house(24, 18)
    day = 0.6 + 0.12 * np.maximum(61 - warm, 0)
    p = bills.periods
    use = np.array([day[a:b].sum() for a, b in zip(p.start, p.end, strict=True)])
    rng = np.random.default_rng(3)
    use *= 1 + 0.03 * rng.normal(size=p.n)
    _, _, checks = assessed(replace(bills, periods=replace(p, use=use)), work, station=station)
    for name in ("weather not seen", "heating degree-days not seen"):
        assert named(checks, name).meets is False
    assert "colder" in named(checks, "weather not seen").means
    degree, days = (named(checks, n).value for n in
                    ("heating degree-days not seen", "weather not seen"))  # fmt: skip
    assert degree is not None
    assert days is not None
    assert degree > days  # cold days carry more than their share


def test_without_a_long_term_year_nothing_is_said_of_it() -> None:
    bills, work = house(24, 18, noise=0.05)
    aligned = align(bills.periods, STATION)
    found = compare(aligned, work, None, forms=GAS)
    asked = Asked(aligned, None, GAS, 0.90)
    close = scrutinise(asked, found, work_start=work.start)
    checks = checks_of(
        found.savings, close.evidence, n_after=18, without=close.without, placebo=close.placebo
    )
    names = {c.name for c in checks}
    assert "weather not seen" not in names
    assert "answer without any one bill" in names  # of avoided use
    invented = named(checks, "invented work dates")
    assert invented.meets is None
    assert "no long-term year" in invented.means


def test_invented_dates_are_one_check() -> None:
    bills, work = house(36, 14, noise=0.05)
    aligned = align(bills.periods, STATION)
    found = compare(aligned, work, year(), forms=GAS)
    close = scrutinise(Asked(aligned, year(), GAS, 0.90), found, work_start=work.start)
    assert close.placebo is not None
    assert len(close.placebo.dates) > 12
    share = close.placebo.share
    assert share is not None
    check = named(
        checks_of(found.savings, close.evidence, n_after=14, placebo=close.placebo),
        "invented work dates",
    )
    assert check.value == share
    assert check.limit == MOST_ANNOUNCED
    assert check.meets == (share <= MOST_ANNOUNCED)
    assert "than the real one" in check.means


def test_evidence_is_of_the_sides_that_have_a_fit() -> None:
    bills, work = house(24, 5, noise=0.05)
    aligned = align(bills.periods, STATION)
    found = compare(aligned, work, year(), forms=GAS)
    sides: tuple[SideEvidence, ...] = evidence_of(aligned, found, year())
    assert [s.side for s in sides] == ["before"]
    assert sides[0].first == int(aligned.start[0])
    assert sides[0].spans[0] == (int(aligned.start[0]), int(aligned.end[0]))


def test_a_bill_without_neighbours_divides_by_nothing() -> None:
    """A leverage of one leaves no residual to judge: NaN, not a warning or an error."""
    x = np.array([[1.0, 0.0], [1.0, 0.0], [1.0, 0.0], [1.0, 5.0]])
    found = weigh(x, np.array([0.1, -0.2, 0.1, 0.0]), np.ones(4))
    assert found[3].leverage == pytest.approx(1.0)
    assert not np.isfinite(found[3].dffits) or found[3].dffits == 0.0
    assert np.isfinite(found[0].cook)


def test_periods_are_not_needed_to_be_without_gaps() -> None:
    bills, work = house(24, 18, noise=0.05)
    p = bills.periods
    keep = np.arange(p.n) != 7
    gapped = Periods(
        p.start[keep], p.end[keep], p.use[keep], p.cost[keep], p.estimated[keep], p.joined[keep]
    )
    _, _, checks = assessed(replace(bills, periods=gapped), work)
    days = int(p.end[7] - p.start[7])
    assert f"{days} of those days are in no usable bill" in named(checks, "days of bills").means


def test_the_year_of_the_doctest_is_a_year() -> None:
    made = year_from_sample("x", [10.0, 30.0, 70.0], [65.0, 150.0, 150.0])
    assert made.heating(60.0) == pytest.approx(7750.0)


def test_a_drivers_column_is_among_those_of_the_fit() -> None:
    """Leverage and Cook's distance with an occupancy column: statsmodels 0.15, OLS, rows √w."""
    from normalize.fitting.drivers import Drivers

    bills, work = house(24, 18, noise=0.08)
    aligned = align(bills.periods, STATION)
    found = compare(aligned, work, year(), forms=GAS)
    values = np.cos(np.arange(aligned.n))[:, None]
    driven = replace(aligned, drivers=Drivers(("units",), values, (0.0,), ("made up",)))
    fit, x, jac, y, w = side_of(aligned, found, "before")
    assert fit.heating_slope is not None
    evidence = evidence_of(driven, found, year())[0]
    full = scaled(y, np.column_stack([jac, values[:24]]), w).get_influence()
    assert [b.leverage for b in evidence.weights] == pytest.approx(full.hat_matrix_diag, rel=1e-9)
    resid = scaled(y, np.column_stack([x, values[:24]]), w).resid / np.sqrt(w)
    ours = weigh(np.column_stack([jac, values[:24]]), resid, w)
    assert [b.cook for b in evidence.weights] == pytest.approx([b.cook for b in ours], rel=1e-8)
