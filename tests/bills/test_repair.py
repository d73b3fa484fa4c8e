"""Rules of repair, one by one, and what must hold for any mix of faults.

The expected outcomes are the rules' own statement (normalize/bills/rules.py, with sources
there); no outside reference exists for them.  Where a rule is the trade's it is named.
"""

from __future__ import annotations

from collections.abc import Sequence

import numpy as np
import pytest
from hypothesis import HealthCheck, given, settings
from hypothesis import strategies as st

from normalize.bills.periods import BillRow, Bills, LedgerEntry, Periods
from normalize.bills.repair import reconcile, repair, repair_batch
from normalize.errors import BillError

Row = tuple[int, int, float] | tuple[int, int, float, str]


def rows(*given_rows: Row) -> list[BillRow]:
    """(start, end, use[, "e" for estimated]) as rows on lines 2, 3, …."""
    return [
        BillRow("b.csv", k + 2, r[0], r[1], r[2], estimated=len(r) > 3 and r[3] == "e")
        for k, r in enumerate(given_rows)
    ]


def periods_of(p: Periods) -> list[tuple[int, int, float]]:
    return [(int(a), int(b), float(u)) for a, b, u in zip(p.start, p.end, p.use, strict=True)]


def fates(ledger: Sequence[LedgerEntry]) -> list[int]:
    """Period numbers, 0 for left out."""
    return [0 if e.fate == "left out" else int(e.fate.split()[1]) for e in ledger]


ESTIMATE = "estimated reading, joined to the next actual one"

CASES: dict[str, tuple[list[Row], list[tuple[int, int, float]], list[int], dict[int, str]]] = {
    "clean bills are left alone": (
        [(0, 30, 5), (30, 61, 6)],
        [(0, 30, 5), (30, 61, 6)],
        [1, 2],
        {0: "", 1: ""},
    ),
    "newest first": ([(30, 61, 6), (0, 30, 5)], [(0, 30, 5), (30, 61, 6)], [2, 1], {}),
    "gap kept as a gap": (
        [(0, 30, 5), (90, 120, 6)],
        [(0, 30, 5), (90, 120, 6)],
        [1, 2],
        {},
    ),
    # Program evaluation practice: fold an estimate into the next actual reading (practice.md).
    "estimate joined to the next actual": (
        [(0, 30, 5), (30, 60, 7, "e"), (60, 90, 4)],
        [(0, 30, 5), (30, 90, 11)],
        [1, 2, 2],
        {1: ESTIMATE, 2: "actual reading, takes in the estimated one before it"},
    ),
    "run of estimates": (
        [(0, 30, 5, "e"), (30, 60, 7, "e"), (60, 90, 4)],
        [(0, 90, 16)],
        [1, 1, 1],
        {2: "actual reading, takes in the estimated one before it; unusually long period, kept"},
    ),
    "negative true-up of an estimate is not a fault": (
        [(0, 30, 50, "e"), (30, 60, -10), (60, 90, 20)],
        [(0, 60, 40), (60, 90, 20)],
        [1, 1, 2],
        {},
    ),
    "estimate before a gap is left out": (
        [(0, 30, 5, "e"), (60, 90, 4)],
        [(60, 90, 4)],
        [0, 1],
        {0: "estimated reading, and no actual reading follows it directly"},
    ),
    "trailing estimates are left out": (
        [(0, 30, 5), (30, 60, 5, "e"), (60, 90, 4, "e")],
        [(0, 30, 5)],
        [1, 0, 0],
        {},
    ),
    "exact duplicate": (
        [(0, 30, 5), (0, 30, 5), (30, 60, 6)],
        [(0, 30, 5), (30, 60, 6)],
        [0, 1, 2],
        {0: "the same bill as line 3"},
    ),
    # Last version per service period (practice.md, Bills).
    "cancel and rebill": (
        [(0, 30, 500), (0, 30, -500), (0, 30, 50), (30, 60, 6)],
        [(0, 30, 50), (30, 60, 6)],
        [1, 1, 1, 2],
        {
            0: "cancelled against line 3 and billed again",
            2: "the last of several versions of this bill",
        },
    ),
    "cancel and rebill of the same amount is no duplicate": (
        [(0, 30, 50), (0, 30, -50), (0, 30, 50)],
        [(0, 30, 50)],
        [1, 1, 1],
        {},
    ),
    "cancel and rebill, newest first": (
        [(30, 60, 6), (0, 30, 50), (0, 30, -500), (0, 30, 500)],
        [(0, 30, 50), (30, 60, 6)],
        [2, 1, 1, 1],
        {},
    ),
    "cancelled for good": (
        [(0, 30, 50), (0, 30, -50), (30, 60, 6)],
        [(30, 60, 6)],
        [0, 0, 1],
        {0: "cancelled against line 3, and not billed again for the same dates"},
    ),
    "two bills cancelled, billed again as one": (
        [(0, 30, 50), (30, 60, 40), (0, 30, -50), (30, 60, -40), (0, 60, 85)],
        [(0, 60, 85)],
        [0, 0, 0, 0, 1],
        {},
    ),
    "later version replaces": (
        [(0, 30, 50), (0, 30, 45)],
        [(0, 30, 45)],
        [0, 1],
        {0: "replaced by a later version of the same bill on line 3"},
    ),
    "actual reading is preferred to a later estimate": (
        [(0, 30, 45), (0, 30, 50, "e")],
        [(0, 30, 45)],
        [1, 0],
        {},
    ),
    "a correction that is a difference is added": (
        [(0, 30, 50), (0, 30, -8)],
        [(0, 30, 42)],
        [1, 1],
        {1: "a correction, added to the bill on line 2"},
    ),
    "a credit without usage keeps the bill": (
        [(0, 30, 50), (0, 30, 0)],
        [(0, 30, 50)],
        [1, 1],
        {1: "a credit without usage, counted with the bill on line 2"},
    ),
    "negative without partner": (
        [(0, 30, 50), (30, 60, -9)],
        [(0, 30, 50)],
        [1, 0],
        {1: "negative usage, and no earlier bill that it corrects"},
    ),
    "small overlap is trimmed off the later": (
        [(0, 31, 5), (30, 60, 6)],
        [(0, 31, 5), (31, 60, 6)],
        [1, 2],
        {1: "overlapped the bill before it by a few days; starts where that one ends"},
    ),
    "overlap: the later in the file is preferred": (
        [(0, 30, 5), (30, 60, 6), (10, 60, 9)],
        [(10, 60, 9)],
        [0, 0, 1],
        {},
    ),
    "overlap: actual before estimated": (
        [(0, 60, 9), (30, 60, 6, "e"), (60, 90, 4)],
        [(0, 60, 9), (60, 90, 4)],
        [1, 0, 2],
        {},
    ),
    "subtotal of the bills it covers": (
        [(0, 30, 5), (30, 60, 6), (60, 90, 7), (0, 90, 18)],
        [(0, 30, 5), (30, 60, 6), (60, 90, 7)],
        [1, 2, 3, 0],
        {3: "covers other bills and repeats their sum"},
    ),
    "stub joined to the next": (
        [(0, 30, 5), (30, 33, 1), (33, 63, 6), (63, 93, 7)],
        [(0, 30, 5), (30, 63, 7), (63, 93, 7)],
        [1, 2, 2, 3],
        {1: "shorter than 5 days, joined to the next period"},
    ),
    "last stub joined to the one before": (
        [(0, 30, 5), (30, 60, 6), (60, 62, 1)],
        [(0, 30, 5), (30, 62, 7)],
        [1, 2, 2],
        {},
    ),
    "daily readings are not stubs": (
        [(0, 1, 5), (1, 2, 6), (2, 3, 1)],
        [(0, 1, 5), (1, 2, 6), (2, 3, 1)],
        [1, 2, 3],
        {0: ""},
    ),
    "long and short are kept": (
        [(0, 30, 5), (30, 120, 6), (120, 130, 1), (130, 160, 5), (160, 190, 5)],
        [(0, 30, 5), (30, 120, 6), (120, 130, 1), (130, 160, 5), (160, 190, 5)],
        [1, 2, 3, 4, 5],
        {1: "unusually long period, kept", 2: "unusually short period, kept"},
    ),
    "two-monthly reading is not long": (
        [(0, 61, 5), (61, 120, 6), (120, 181, 1)],
        [(0, 61, 5), (61, 120, 6), (120, 181, 1)],
        [1, 2, 3],
        {0: "", 1: "", 2: ""},
    ),
    "no days, backwards, absurd, not a number": (
        [(0, 30, 5), (30, 30, 1), (60, 50, 1), (60, 90, 1e13), (90, 120, float("nan"))],
        [(0, 30, 5)],
        [1, 0, 0, 0, 0],
        {1: "covers no days", 2: "ends before it starts"},
    ),
    "far-off dates": (
        [(0, 30, 5), (2932500, 2932530, 1), (-800000, -799970, 1), (10**12, 10**12 + 30, 1)],
        [(0, 30, 5)],
        [1, 0, 0, 0],
        {1: "a date outside 1900 to 2100"},
    ),
}


@pytest.mark.kernel
@pytest.mark.parametrize("name", CASES)
def test_rule(name: str) -> None:
    given_rows, expected, expected_fates, notes = CASES[name]
    periods, ledger = repair(rows(*given_rows))
    assert periods_of(periods) == expected
    assert fates(ledger) == expected_fates
    for k, text in notes.items():
        assert ledger[k].note == text


def test_net_metered_keeps_negative_use() -> None:
    given_rows = rows((0, 30, 50), (30, 60, -9))
    periods, _ = repair(given_rows, net_metered=True)
    assert periods_of(periods) == [(0, 30, 50), (30, 60, -9)]


def test_partial_fills_count_with_the_next_full_one() -> None:
    given_rows = rows((0, 40, 100), (40, 70, 60, "e"), (70, 100, 80), (100, 120, 50, "e"))
    periods, ledger = repair(given_rows, kind="delivery")
    assert periods_of(periods) == [(0, 40, 100), (40, 100, 140)]
    assert ledger[1].note == "partial fill, counted with the next full one"
    assert ledger[3].note == "partial fill, and no full fill follows it directly"


def test_deliveries_of_one_day_are_added() -> None:
    periods, ledger = repair(rows((0, 40, 100), (0, 40, 30), (40, 80, 90)), kind="delivery")
    assert periods_of(periods) == [(0, 40, 130), (40, 80, 90)]
    assert "second delivery of the same day" in ledger[0].note + ledger[1].note


def test_cost_and_temperature_of_joined_bills() -> None:
    given_rows = [
        BillRow("b.csv", 2, 0, 30, 5.0, 10.0, True, 20.0),
        BillRow("b.csv", 3, 30, 40, 4.0, 8.0, False, 60.0),
    ]
    periods, _ = repair(given_rows)
    assert periods.cost.tolist() == [18.0]
    assert periods.mean_temp_f is not None
    assert periods.mean_temp_f.tolist() == pytest.approx([(20 * 30 + 60 * 10) / 40])
    assert periods.joined.tolist() == [2]
    assert not periods.estimated.any()


def test_a_row_with_a_problem_keeps_its_reason() -> None:
    row = BillRow("b.csv", 2, None, None, 5.0, problem="'x' is not a date")
    periods, ledger = repair([row, BillRow("b.csv", 3, 0, 30, None)])
    assert periods.n == 0
    assert [e.note for e in ledger] == ["'x' is not a date", "without usage"]


def test_nothing_at_all() -> None:
    periods, ledger = repair([])
    assert periods.n == 0
    assert ledger == ()


def test_tangle_is_left_out_in_bounded_time() -> None:
    n = 20_000
    batch = repair_batch([0] * n, np.arange(n) + 30, np.ones(n), np.ones(n), [False] * n, [0, n])
    assert batch.start.shape == (0,)
    assert set(batch.reason.tolist()) == {12}


@pytest.mark.parametrize("offsets", [[0, 1], [0, 3], [1, 2], [0, 2, 1, 2]])
def test_arrays_that_do_not_belong_together(offsets: list[int]) -> None:
    with pytest.raises(ValueError, match="offsets"):
        repair_batch([0, 30], [30, 60], [1, 2], [1, 2], [False, False], offsets)


# --- What must hold for any mix of faults -------------------------------------------------


@st.composite
def histories(draw: st.DrawFn) -> list[BillRow]:
    """A clean history with a random mix of faults injected."""
    n = draw(st.integers(1, 14))
    lengths = draw(st.lists(st.integers(1, 70), min_size=n, max_size=n))
    day = draw(st.integers(-3000, 20000))
    made: list[tuple[int, int, float, float, bool]] = []
    for length in lengths:
        use = draw(st.sampled_from([0.0, 1.5, 7.25, 40.0, 812.3, 1e6]))
        cost = draw(st.sampled_from([1.0, 55.5, float("nan")]))
        made.append((day, day + length, use, cost, draw(st.integers(0, 4)) == 0))
        day += length + draw(st.sampled_from([0, 0, 0, 0, 0, 1, 3, 4, 40]))
    for _ in range(draw(st.integers(0, 6))):
        made = _with_fault(draw, made)
    if draw(st.booleans()):
        made.reverse()
    return [BillRow("b.csv", k + 2, *m) for k, m in enumerate(made)]


def _with_fault(
    draw: st.DrawFn, made: list[tuple[int, int, float, float, bool]]
) -> list[tuple[int, int, float, float, bool]]:
    k = draw(st.integers(0, len(made) - 1))
    s, e, u, c, est = made[k]
    fault = draw(
        st.sampled_from(
            ["twice", "cancel", "rebill", "shift", "negate", "missing", "zero", "span", "wild"]
        )
    )
    at = draw(st.sampled_from([k + 1, len(made)]))
    if fault == "missing":
        return made[:k] + made[k + 1 :] if len(made) > 1 else made
    extra = {
        "twice": [(s, e, u, c, est)],
        "cancel": [(s, e, -u, -c, est)],
        "rebill": [(s, e, -u, -c, est), (s, e, u + 3.0, c, False)],
        "shift": [(s + draw(st.integers(-20, 20)), e + draw(st.integers(-9, 20)), u + 1.0, c, est)],
        "negate": [(s, e, -0.5 * u - 1.0, c, est)],
        "zero": [(s, e, 0.0, -5.0, False)],
        "span": [(s, max(m[1] for m in made), sum(m[2] for m in made if m[2] > 0), c, est)],
        "wild": [draw(st.sampled_from([(s, s, u, c, est), (e, s, u, c, est),
                                       (s, e, float("inf"), c, est), (s, e, 1e300, c, est),
                                       (10**7, 10**7 + 30, u, c, est)]))],
    }[fault]  # fmt: skip
    return made[:at] + extra + made[at:]


def check_everything(given_rows: list[BillRow], kind: str, net: bool) -> None:
    periods, ledger = repair(given_rows, kind=kind, net_metered=net)  # type: ignore[arg-type]
    bills = Bills("", "natural gas", "therm", tuple(given_rows), periods, ledger, kind=kind)
    reconcile(bills)  # fates partition the rows, usage adds up, periods never overlap
    assert np.all(np.isfinite(periods.use))
    assert net or np.all(periods.use >= 0)
    again = [
        BillRow("b.csv", k + 2, int(s), int(e), float(u), float(c))
        for k, (s, e, u, c) in enumerate(
            zip(periods.start, periods.end, periods.use, periods.cost, strict=True)
        )
    ]
    same, second = repair(again, kind=kind, net_metered=net)  # type: ignore[arg-type]
    for name in ("start", "end", "use", "cost"):
        np.testing.assert_array_equal(getattr(same, name), getattr(periods, name))
    assert fates(second) == list(range(1, periods.n + 1))


@pytest.mark.kernel
@settings(max_examples=400, deadline=None, suppress_health_check=[HealthCheck.too_slow])
@given(histories(), st.sampled_from(["meter", "delivery"]), st.booleans())
def test_any_mix_of_faults_reconciles(given_rows: list[BillRow], kind: str, net: bool) -> None:
    check_everything(given_rows, kind, net)
    _, ledger = repair(given_rows, kind=kind, net_metered=net)
    assert len(ledger) == len(given_rows)


@pytest.mark.kernel
@settings(max_examples=60, deadline=None, suppress_health_check=[HealthCheck.too_slow])
@given(st.lists(histories(), min_size=1, max_size=5))
def test_a_batch_gives_each_account_the_same_bits(many: list[list[BillRow]]) -> None:
    flat = [r for account in many for r in account]
    offsets = np.cumsum([0, *(len(a) for a in many)])
    clip = 2**30
    batch = repair_batch(
        [min(r.start or 0, clip) for r in flat],
        [min(r.end or 0, clip) for r in flat],
        [r.use for r in flat],
        [r.cost for r in flat],
        [r.estimated for r in flat],
        offsets,
    )
    for k, account in enumerate(many):
        alone, ledger = repair(account)
        own = slice(batch.offsets[k], batch.offsets[k + 1])
        assert batch.use[own].tobytes() == alone.use.tobytes()
        assert batch.start[own].tolist() == alone.start.tolist()
        assert batch.end[own].tolist() == alone.end.tolist()
        own_rows = slice(offsets[k], offsets[k + 1])
        assert (batch.fate[own_rows] + 1).tolist() == fates(ledger)


@pytest.mark.parametrize(
    "spoil",
    [
        lambda b: {"ledger": b.ledger[:-1]},
        lambda b: {"ledger": (*b.ledger[:-1], LedgerEntry("b.csv", 3, "left out", ""))},
        lambda b: {"ledger": (*b.ledger[:-1], LedgerEntry("b.csv", 3, "left out", "why"))},
        lambda b: {"ledger": (*b.ledger[:-1], LedgerEntry("b.csv", 3, "period 1"))},
        lambda b: {"rows": (b.rows[0], BillRow("b.csv", 3, 30, 61, 7.0))},
        lambda b: {"ledger": b.ledger[::-1]},
    ],
)
def test_reconcile_can_fail(spoil) -> None:  # type: ignore[no-untyped-def]
    from dataclasses import replace

    given_rows = rows((0, 30, 5), (30, 61, 6))
    periods, ledger = repair(given_rows)
    bills = Bills("", "natural gas", "therm", tuple(given_rows), periods, ledger)
    reconcile(bills)
    with pytest.raises(BillError, match="do not add up"):
        reconcile(replace(bills, **spoil(bills)))
