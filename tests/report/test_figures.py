"""Figures: real text, findings as titles, the agreed marks, the same bytes."""

from __future__ import annotations

import re
import subprocess
import sys
import xml.etree.ElementTree as ET
from dataclasses import replace
from typing import TYPE_CHECKING

import pytest

from normalize.report import look, marks, svg
from normalize.report.figures import figures_of
from normalize.report.numbers import NBSP
from normalize.savings.results import Estimate

if TYPE_CHECKING:
    from normalize.report.svg import Picture
    from normalize.site import AccountResult, SiteResult

SVG = "{http://www.w3.org/2000/svg}"


@pytest.fixture(scope="module")
def gas(gas_house_result: SiteResult) -> dict[str, Picture]:
    drawn = figures_of(gas_house_result.accounts[0], gas_house_result.site.year, 1)
    return {p.key.removeprefix("a1-"): p for p in drawn.shown}


def texts(picture: Picture) -> list[str]:
    root = ET.fromstring(picture.standalone().split("\n", 1)[1])
    return ["".join(t.itertext()) for t in root.iter(f"{SVG}text")]


def test_all_four_are_drawn(gas: dict[str, Picture]) -> None:
    assert sorted(gas) == ["residuals", "temperature", "time", "years"]


def test_titles_state_the_finding(gas: dict[str, Picture]) -> None:
    plain = {key: p.title.replace(NBSP, " ") for key, p in gas.items()}
    assert plain["temperature"] == "19 % less gas in a normal year"
    assert plain["years"] == "842 therms before, 678 after"
    assert plain["time"] == "Since the work: 18 % less gas than expected in the same weather"
    assert (
        plain["residuals"]
        == "Bills scatter about their fit by 7.1 % before and 6.2 % after the work"
    )


def test_a_title_never_makes_a_saving_of_nothing(gas_house_result: SiteResult) -> None:
    drawn = figures_of(gas_house_result.accounts[1], gas_house_result.site.year, 2)
    for picture in (drawn.temperature, drawn.years, drawn.time):
        assert picture is not None
        assert "could not be told from" in picture.title


def test_text_is_text_and_names_axes_with_units(gas: dict[str, Picture]) -> None:
    told = texts(gas["temperature"])
    assert "therms a day" in told
    assert "mean outdoor temperature of the bill’s days, °F" in told
    assert "before" in told
    assert "after" in told
    assert any(t.replace(NBSP, " ") == "before: heating below 61 °F" for t in told)
    assert any("therms a normal year" in t for t in texts(gas["years"]))
    for picture in gas.values():
        assert picture.title in texts(picture)
        assert picture.alt
        assert picture.caption


def test_colour_never_speaks_alone(gas: dict[str, Picture]) -> None:
    """Before is dashed, after is not, the counterfactual is dotted, estimates carry a bar."""
    lines = re.findall(r'<path [^>]*style="([^"]*)"', gas["temperature"].body)
    fits = [s for s in lines if "stroke-width: 2" in s]
    dashed = {look.BEFORE: False, look.AFTER: False}
    for style in fits:
        for colour in dashed:
            if f"stroke: {colour}" in style:
                dashed[colour] = "stroke-dasharray" in style
    assert dashed == {look.BEFORE: True, look.AFTER: False}
    dots = [s for s in re.findall(r'style="([^"]*)"', gas["time"].body) if "dasharray: 2.16" in s]
    assert dots
    assert all(look.BEFORE in s for s in dots)
    assert "a bar through an open mark is an estimated reading" in gas["time"].caption


def test_same_bytes_and_nothing_from_outside(
    gas: dict[str, Picture], gas_house_result: SiteResult
) -> None:
    again = figures_of(gas_house_result.accounts[0], gas_house_result.site.year, 1)
    assert [p.standalone() for p in again.shown] == [p.standalone() for p in gas.values()]
    for picture in gas.values():
        alone = picture.standalone()
        for space in ("http://www.w3.org/2000/svg", "http://www.w3.org/1999/xlink"):
            alone = alone.replace(f'"{space}"', "")
        assert "http" not in alone
        assert "date" not in alone.lower().replace("dated", "")
        assert "http" not in picture.inline()


def test_ids_belong_to_their_figure(gas_house_result: SiteResult) -> None:
    ids: list[str] = []
    for number, account in enumerate(gas_house_result.accounts, start=1):
        for picture in figures_of(account, gas_house_result.site.year, number).shown:
            own = re.findall(r' id="([^"]*)"', picture.inline())
            assert all(i.startswith(picture.key) for i in own)
            used = re.findall(r'(?: href="#|url\(#)([^")]*)', picture.inline())
            assert used
            assert set(used) <= set(own)
            ids += own
    assert len(ids) == len(set(ids))


def changed(account: AccountResult, **values: object) -> AccountResult:
    return replace(account, **values)  # type: ignore[arg-type]


def test_two_hundred_periods_and_one(gas_house_result: SiteResult) -> None:
    account = gas_house_result.accounts[0]
    rows = account.periods
    many = tuple(
        replace(rows[i % len(rows)], number=i + 1, start=10_000 + 30 * i, end=10_030 + 30 * i)
        for i in range(200)
    )
    for periods in (many, rows[:1], rows[5:6]):
        drawn = figures_of(changed(account, periods=periods), gas_house_result.site.year, 1)
        assert drawn.time is not None
        assert f"{len(periods)} bills" in drawn.time.alt


def test_nothing_to_draw_draws_nothing(half_known_result: SiteResult) -> None:
    assert figures_of(half_known_result.accounts[1], None, 1).shown == ()


def test_missing_pieces_leave_the_rest(gas_house_result: SiteResult) -> None:
    account = gas_house_result.accounts[0]
    nan = float("nan")
    rows = tuple(
        replace(r, mean_temp_f=nan if r.number % 2 else r.mean_temp_f, fitted_per_day=nan)
        for r in account.periods
    )
    none = Estimate.none("no reason")
    bare = changed(
        account,
        periods=rows,
        curve_after=None,
        work_start=None,
        work_end=None,
        savings=replace(account.savings, after=None, nac_after=none, normalized=none, avoided=none),
    )
    drawn = figures_of(bare, None, 1)
    assert drawn.temperature is not None
    assert drawn.temperature.title.replace(NBSP, " ") == "Gas use before the work rises below 61 °F"
    assert drawn.years is not None
    assert "after is not known yet" in drawn.years.title
    assert drawn.residuals is None


@pytest.mark.parametrize("absurd", [1e300, -1e300, float("inf"), float("nan")])
def test_absurd_numbers_are_left_undrawn(gas_house_result: SiteResult, absurd: float) -> None:
    account = gas_house_result.accounts[0]
    rows = (replace(account.periods[0], use_per_day=absurd), *account.periods[1:])
    drawn = figures_of(changed(account, periods=rows), gas_house_result.site.year, 1)
    assert drawn.time is not None
    assert f"{len(rows) - 1} bills" in drawn.time.alt


@pytest.mark.parametrize(
    "unit", ["$x^2$ <script>", 'a" style="x', "\u05d1\u05d9\u05ea", "🏠🏠", "%s\\n"]
)
def test_hostile_units_stay_text(gas_house_result: SiteResult, unit: str) -> None:
    account = changed(gas_house_result.accounts[0], unit=unit, fuel=unit)
    for picture in figures_of(account, gas_house_result.site.year, 1).shown:
        ET.fromstring(picture.standalone().split("\n", 1)[1])
        assert "<script" not in picture.inline()
        classes: dict[str, str] = {}
        svg.with_classes(picture.inline(), classes)
        assert "x" not in classes


def test_other_forms_are_drawn(farm_result: SiteResult, gas_house_result: SiteResult) -> None:
    fits = gas_house_result.accounts[0]
    assert fits.savings.before is not None
    for form, heat, cool, line in (
        ("heating and cooling", 58.0, 70.0, None),
        ("two slopes", 60.0, 60.0, None),
        ("line", None, None, -0.08),
        ("flat", None, None, None),
    ):
        fit = replace(
            fits.savings.before,
            form=form,
            balance_heating_f=heat,
            balance_cooling_f=cool,
            line_slope=line,
            heating_slope=0.1 if heat else None,
            cooling_slope=0.2 if cool else None,
        )
        account = changed(fits, savings=replace(fits.savings, before=fit))
        drawn = figures_of(account, gas_house_result.site.year, 1)
        assert drawn.temperature is not None
        told = " ".join(texts(drawn.temperature)).replace(NBSP, " ")
        assert ("cooling above 70 °F" in told) == (form == "heating and cooling")
        assert ("turns at 60 °F" in told) == (form == "two slopes")


def test_the_gap_is_shaded_though_the_lines_have_points_of_their_own(
    gas_house_result: SiteResult,
) -> None:
    account = gas_house_result.accounts[0]
    curve = account.curve_after
    assert curve is not None
    sparse = replace(curve, temp_f=curve.temp_f[1::7], use_per_day=curve.use_per_day[1::7])
    for after, shaded in ((curve, True), (sparse, True), (None, False)):
        drawn = figures_of(changed(account, curve_after=after), gas_house_result.site.year, 1)
        assert drawn.temperature is not None
        assert ("opacity: 0.14" in drawn.temperature.body) is shaded


def test_a_bill_is_a_step_and_a_missing_bill_a_gap() -> None:
    xs, ys = marks.steps([(0, 30, 2.0), (30, 61, 3.0), (91, 120, 4.0)])
    assert xs == [0, 30, 30, 61, 91, 91, 120]
    assert [y == y for y in ys] == [True, True, True, True, False, True, True]


def test_neither_pandas_nor_pyplot_nor_statsmodels_is_loaded() -> None:
    """The whole run must cost no more than a few imports (issue 2)."""
    code = """if True:
        import sys
        import normalize.report.html, normalize.report.json, normalize.report.text
        assert "matplotlib" not in sys.modules, "loaded before it is needed"
        from normalize.report import svg
        with svg.surface(100.0) as figure:
            svg.picture(figure, "k", title="", alt="", caption="", height=100.0)
        slow = {"pandas", "matplotlib.pyplot", "statsmodels", "scipy"}
        assert not slow & set(sys.modules), slow & set(sys.modules)
    """
    done = subprocess.run(
        [sys.executable, "-c", code], capture_output=True, text=True, check=False, timeout=120
    )
    assert done.returncode == 0, done.stderr


def luminance(colour: str) -> float:
    parts = [int(colour[i : i + 2], 16) / 255 for i in (1, 3, 5)]
    linear = [c / 12.92 if c <= 0.03928 else ((c + 0.055) / 1.055) ** 2.4 for c in parts]
    return 0.2126 * linear[0] + 0.7152 * linear[1] + 0.0722 * linear[2]


@pytest.mark.parametrize("token", ["ink", "quiet", "before", "after", "weather", "care"])
@pytest.mark.parametrize("shade", [0, 1])
def test_colours_can_be_read_on_paper(token: str, shade: int) -> None:
    """Contrast of at least 4.5 : 1 for text: WCAG 2.1, success criterion 1.4.3."""
    one, two = luminance(look.TOKENS[token][shade]), luminance(look.TOKENS["paper"][shade])
    assert (max(one, two) + 0.05) / (min(one, two) + 0.05) >= 4.5
