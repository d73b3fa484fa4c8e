"""When did it change?  Sentences, table and JSON of one account's scan."""

from __future__ import annotations

from typing import TYPE_CHECKING, Any

from normalize.days import iso
from normalize.report import numbers as n
from normalize.report import tables, words
from normalize.savings.break_words import claim_sentences, odd_sentences, other_sentences

if TYPE_CHECKING:
    from normalize.report.tables import Table
    from normalize.savings.break_results import Breaks, ClaimedDate, FoundChange, OddPeriod
    from normalize.site import AccountResult


def sentences(account: AccountResult) -> list[str]:
    """What the scan says, the claimed date first."""
    found = account.breaks
    if found is None or account.work_start is None or account.work_end is None:
        return []
    out = claim_sentences(found, account.work_start, account.work_end)
    if found.unavailable:
        return out
    return [*out, *other_sentences(found, words.unit_word(account.unit)), *odd_sentences(found)]


def table_of(account: AccountResult) -> Table | None:
    """Every test with its date, range, statistic and p."""
    found = account.breaks
    if found is None or found.claimed is None:
        return None
    c = found.claimed
    none = n.UNKNOWN
    rows = [
        (
            "a change at any date", iso(c.day), iso(c.low), iso(c.high), none, _f(c.f_any),
            _p(c.p_any),
        ),
        ("a change at the work", none, none, none, none, _f(c.f), _p(c.p)),
    ]  # fmt: skip
    for x in found.changes:
        size = n.percent(x.fraction) if x.fraction is not None else n.plain(x.change, 0)
        size = size.replace("-", n.MINUS)
        rows.append(
            (
                f"a change beside the work{_explained(x.explained)}", iso(x.day), iso(x.low),
                iso(x.high), size, none, _p(x.p),
            )
        )  # fmt: skip
    if found.p_rest is not None and not found.changes:
        rows.append(("a change beside the work", none, none, none, none, none, _p(found.p_rest)))
    for o in found.odd:
        share = n.UNKNOWN
        if o.expected_per_day > 0.0:
            share = n.percent(o.use_per_day / o.expected_per_day - 1.0).replace("-", n.MINUS)
        rows.append(
            (
                f"an odd bill{_explained(o.explained)}", none, iso(o.start), iso(o.end), share,
                none, _p(o.p),
            )
        )  # fmt: skip
    what = "months joined from daily data" if found.joined else "bills"
    caption = (
        f"Dates of change: {found.n} {what}, form “{tables.form_words(found.form)}”, lag-1 "
        f"correlation {n.plain(found.rho, 2)}; p by simulation without a change, "
        f"announced at 0.05 (F above {_f(c.threshold)} for any date)"
    )
    header = ("looked for", "most likely", "from", "to", "size", "F", "p")
    return tables.Table(caption, header, tuple(rows), frozenset({4, 5, 6}))


def _explained(what: str) -> str:
    return f" (“{n.clean(what)}”)" if what else ""


def _f(value: float | None) -> str:
    return n.UNKNOWN if value is None else n.plain(value, 1)


def _p(value: float | None) -> str:
    return n.UNKNOWN if value is None else n.plain(value, 3)


def as_json(found: Breaks | None) -> dict[str, Any] | None:
    """The key ``breaks`` of an account (docs/json.md); null where no scan was made."""
    if found is None:
        return None
    return {
        "unavailable": found.unavailable or None,
        "n_periods": found.n,
        "joined_daily": found.joined,
        "form": found.form or None,
        "error_power": found.power,
        "rho": found.rho,
        "claimed": _claimed_json(found.claimed),
        "scan": [
            {"date": iso(day), "f": f if f == f else None}
            for day, f in zip(found.dates, found.f, strict=True)
        ],
        "changes": [_change_json(c) for c in found.changes],
        "p_further": found.p_rest,
        "not_searched": list(found.not_searched),
        "odd_periods": [_odd_json(o) for o in found.odd],
    }


def _claimed_json(c: ClaimedDate | None) -> dict[str, Any] | None:
    if c is None:
        return None
    return {
        "f": c.f,
        "p": c.p,
        **_dates(c),
        "f_any_date": c.f_any,
        "p_any_date": c.p_any,
        "threshold": c.threshold,
        "announced": c.announced,
        "meets_work": c.meets,
    }


def _dates(c: ClaimedDate | FoundChange) -> dict[str, str]:
    return {"most_likely": iso(c.day), "from": iso(c.low), "to": iso(c.high)}


def _change_json(c: FoundChange) -> dict[str, Any]:
    return {
        **_dates(c),
        "side": c.side,
        "change": c.change,
        "change_low": c.change_low,
        "change_high": c.change_high,
        "fraction": c.fraction,
        "fraction_low": c.fraction_low,
        "fraction_high": c.fraction_high,
        "p": c.p,
        "declared": c.explained or None,
        "in_answer": c.mixed,
    }


def _odd_json(o: OddPeriod) -> dict[str, Any]:
    return {
        "start": iso(o.start),
        "end": iso(o.end),
        "periods": list(o.numbers),
        "use_per_day": o.use_per_day,
        "expected_per_day": o.expected_per_day,
        "t": o.t,
        "p": o.p,
        "declared": o.explained or None,
    }
