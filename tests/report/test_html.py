"""The HTML file: whole, safe, complete, the same bytes."""

from __future__ import annotations

import base64
import hashlib
import itertools
import os
import re
import subprocess
import sys
from dataclasses import replace
from html import unescape
from html.parser import HTMLParser
from pathlib import Path
from typing import TYPE_CHECKING

import pytest

from normalize.errors import UnwritableReport
from normalize.report.html import to_html, write_html
from normalize.report.numbers import NBSP
from normalize.savings.results import Amount, Check, Price, Total

if TYPE_CHECKING:
    from normalize.site import SiteResult

# Elements that HTML closes by itself; SVG's own empty elements are written with a slash.
VOID = {"meta", "br", "hr", "img", "link", "input", "col", "wbr"}
SCRIPTING = re.compile(
    r"\son[a-z]+\s*=|javascript:|<iframe|<object|<embed|<link|<img", re.IGNORECASE
)


class Balance(HTMLParser):
    """Notes unclosed and misplaced tags, ids, attributes and visible text."""

    def __init__(self) -> None:
        super().__init__()
        self.open: list[str] = []
        self.faults: list[str] = []
        self.ids: list[str] = []
        self.refs: list[str] = []
        self.tags: list[str] = []
        self.text: list[str] = []

    def handle_starttag(self, tag: str, attrs: list[tuple[str, str | None]]) -> None:
        self.tags.append(tag)
        self._note(attrs)
        if tag not in VOID:
            self.open.append(tag)

    def handle_startendtag(self, tag: str, attrs: list[tuple[str, str | None]]) -> None:
        self.tags.append(tag)
        self._note(attrs)

    def _note(self, attrs: list[tuple[str, str | None]]) -> None:
        for name, value in attrs:
            if name == "id":
                self.ids.append(value or "")
            if name in ("aria-labelledby", "aria-describedby"):
                self.refs += (value or "").split()
            if name in ("href", "src", "xlink:href"):
                assert (value or "").startswith("#"), value
                self.refs.append((value or "")[1:])

    def handle_endtag(self, tag: str) -> None:
        if not self.open or self.open.pop() != tag:
            self.faults.append(tag)

    def handle_data(self, data: str) -> None:
        self.text.append(data)


def parsed(html: str) -> Balance:
    page = Balance()
    page.feed(html)
    page.close()
    return page


def words_of(html: str) -> str:
    return " ".join(" ".join(parsed(html).text).replace(NBSP, " ").split())


@pytest.fixture(scope="module")
def gas_html(gas_house_result: SiteResult) -> str:
    return to_html(gas_house_result)


def test_tags_balance_and_references_resolve(any_result: SiteResult) -> None:
    page = parsed(to_html(any_result))
    assert page.faults == []
    assert page.open == []
    assert len(page.ids) == len(set(page.ids))
    assert set(page.refs) <= set(page.ids)


def test_no_script_and_nothing_fetched(any_result: SiteResult) -> None:
    html = to_html(any_result)
    assert "script" not in parsed(html).tags
    assert "<script" not in html
    assert SCRIPTING.search(html) is None
    assert "http" not in html.replace("http-equiv", "")
    assert "@import" not in html
    assert "url(" not in re.sub(r'clip-path="url\(#[\w-]+\)"', "", html)


def test_policy_allows_this_one_style_sheet(any_result: SiteResult) -> None:
    """Hash source after CSP Level 3: the element's text, UTF-8, SHA-256, base64."""
    html = to_html(any_result)
    sheet = re.search(r"<style>(.*?)</style>", html, re.DOTALL)
    assert sheet is not None
    digest = base64.b64encode(hashlib.sha256(sheet[1].encode()).digest()).decode()
    assert f"default-src &#39;none&#39;; style-src &#39;sha256-{digest}&#39;" in html
    assert " style=" not in html.replace(sheet[0], "")


def test_it_is_an_accessible_document(gas_html: str) -> None:
    page = parsed(gas_html)
    assert '<html lang="en">' in gas_html
    assert page.tags.count("h1") == 1
    assert page.tags.count("main") == 1
    assert page.tags.count("caption") == page.tags.count("table")
    assert gas_html.count('scope="col"') > 20
    for svg in re.findall(r"<svg[^>]*>.{0,400}", gas_html, re.DOTALL):
        assert 'role="img"' in svg
        assert "<title" in svg
        assert "<desc" in svg
    levels = [int(t[1]) for t in page.tags if re.fullmatch(r"h[1-6]", t)]
    assert all(b - a <= 1 for a, b in itertools.pairwise(levels))


def test_light_dark_and_print(gas_html: str) -> None:
    assert "@media screen and (prefers-color-scheme: dark)" in gas_html
    assert "@media print" in gas_html
    assert "var(--before)" in gas_html
    body = gas_html.split("</style>", 1)[1]
    assert re.search(r"#[0-9a-fA-F]{6}\b", body) is None  # no colour escapes the tokens


def test_it_says_all_that_a_reviewer_looks_for(gas_html: str, gas_house_result: SiteResult) -> None:
    told = words_of(gas_html)
    assert (
        "This site used 19 % less gas in a normal year after the work (between 15 % and 24 %)."
        in told
    )
    for account in gas_house_result.accounts:
        bills = account.bills
        assert bills is not None
        for entry in bills.ledger:
            assert entry.note in told
        for tried in account.tried_before:
            assert tried.reason in told
        for check in account.checks:
            assert check.means[1:] in told
            assert check.source in told
        assert account.co2 is not None
        assert account.co2.source in told
        assert account.co2.year in told
    for _, digest in gas_house_result.site.inputs:
        assert digest in told
    for name, value in (*gas_house_result.settings, *gas_house_result.versions):
        assert name in told
        assert value in told
    for needed in ("0.121000", "0.003700", "0.004900", "therms a day = 0.61 + 0.121·(61.2 − T)⁺",
                   "Alder Falls airfield", "mean of 10 years, 2012-2021", "41 days missing",
                   "attic insulation and air sealing", "September 11, 2023", "$4,150"):  # fmt: skip
        assert needed in told


def test_every_caution_appears(any_result: SiteResult) -> None:
    told = words_of(to_html(any_result))
    for caution in any_result.cautions:
        assert caution in told
    for account in any_result.accounts:
        for caution in account.cautions:
            assert caution in told
    for word in ("burners", "wiring", "ventilation", "heating has failed"):
        assert word in told


def test_missed_checks_say_what_to_do(gas_house_result: SiteResult) -> None:
    missed = Check(
        "CV(RMSE)", "after", 0.4, 0.25, False, "bills scatter widely", "look twice", "us"
    )
    account = replace(gas_house_result.accounts[0], checks=(missed,))
    told = words_of(to_html(replace(gas_house_result, accounts=(account,))))
    assert "0 met, 1 not met (CV(RMSE) after)" in told
    assert "Bills scatter widely. What to do: look twice" in told


HOSTILE = [
    "<script>alert(1)</script>",
    '"><img src=x onerror=alert(1)>',
    "</style><script>x</script>",
    "{{ 7*7 }} {% raw %}",
    "בית ‮ evil",
    "🏠 & 'quotes'",
    "a\x00b\x1b[31m",
    "\ud800",
    "x" * 5000,
]


@pytest.mark.parametrize("name", HOSTILE)
def test_every_users_string_is_escaped(gas_house_result: SiteResult, name: str) -> None:
    site = gas_house_result.site
    account = gas_house_result.accounts[0]
    assert account.bills is not None
    ledger = (replace(account.bills.ledger[0], file=name, note=name), *account.bills.ledger[1:])
    evil = replace(
        account,
        account=name,
        fuel=name,
        unit=name,
        cautions=(name,),
        bills=replace(account.bills, ledger=ledger, reading=(name,)),
        periods=(replace(account.periods[0], reason=name), *account.periods[1:]),
        checks=(Check(name, name, 1.0, 2.0, False, name, name, name),),
        price=Price(1.0, name),
        tried_before=(replace(account.tried_before[0], reason=name),),
    )
    result = replace(
        gas_house_result,
        accounts=(evil,),
        cautions=(name,),
        settings=((name, name),),
        site=replace(
            site,
            name=name,
            currency=name,
            weather=replace(site.weather, station=name, notes=(name,)),
            upgrades=(replace(site.upgrades[0], name=name),),
            changes=(replace(site.changes[0], what=name),),
            inputs=((name, "0" * 64),),
        ),
    )
    html = to_html(result)
    assert html.encode("utf-8")
    page = parsed(html)
    assert page.faults == []
    assert {"script", "img"} & set(page.tags) == set()
    assert "\u202e" not in html
    assert "\x1b" not in html
    assert "\x00" not in html
    assert "49 " not in unescape(html).split("</head>")[0]
    if name.startswith("<script"):
        assert "&lt;script&gt;alert(1)&lt;/script&gt;" in html


def test_account_numbers_are_masked_unless_asked_for(gas_house_result: SiteResult) -> None:
    account = gas_house_result.accounts[0]
    assert account.bills is not None
    number = "0012345678"
    entry = replace(account.bills.ledger[0], file=f"gas_{number}.csv", note=f"meter {number}")
    private = replace(
        account, account=number, bills=replace(account.bills, ledger=(entry,)), cautions=(number,)
    )
    site = replace(gas_house_result.site, inputs=((f"gas_{number}.csv", "0" * 64),))
    result = replace(gas_house_result, accounts=(private,), site=site)
    assert "12345678" not in to_html(result)
    assert "…5678" in to_html(result)
    assert number in to_html(result, show_accounts=True)


def test_everything_may_be_missing(half_known_result: SiteResult) -> None:
    amount = Amount(unavailable="nothing is known")
    empty = replace(
        half_known_result,
        accounts=(half_known_result.accounts[1],),
        total_normalized=Total(amount, amount, amount),
        total_avoided=Total(amount, amount, amount),
        cautions=(),
        settings=(),
        versions=(),
        site=replace(half_known_result.site, upgrades=(), changes=(), inputs=()),
    )
    told = words_of(to_html(empty))
    assert "For propane there is no answer: propane.csv:1: no column looks like usage" in told
    assert "the station has 4 whole years and 10 are asked for" in told
    no_account = words_of(to_html(replace(empty, accounts=())))
    assert "Two Ponds library" in no_account


def test_same_bytes_twice_and_in_another_process(
    gas_html: str, gas_house_result: SiteResult
) -> None:
    assert to_html(gas_house_result) == gas_html
    code = (
        "import importlib.util, hashlib, sys;"
        "spec = importlib.util.spec_from_file_location('made', sys.argv[1]);"
        "made = importlib.util.module_from_spec(spec); spec.loader.exec_module(made);"
        "from normalize.report.html import to_html;"
        "print(hashlib.sha256(to_html(made.gas_house()).encode()).hexdigest())"
    )
    conftest = Path(__file__).with_name("conftest.py")
    root = conftest.parents[2]
    done = subprocess.run(
        [sys.executable, "-c", code, str(conftest)],
        capture_output=True,
        text=True,
        check=True,
        timeout=120,
        cwd=root,
        env={**os.environ, "PYTHONHASHSEED": "77", "TZ": "Asia/Tokyo", "LC_ALL": "C"},
    )
    assert done.stdout.strip() == hashlib.sha256(gas_html.encode()).hexdigest()


def test_write_html_writes_and_says_when_it_cannot(
    gas_house_result: SiteResult, tmp_path: Path
) -> None:
    target = tmp_path / "new" / "report.html"
    write_html(gas_house_result, target)
    assert target.read_bytes() == to_html(gas_house_result).encode()
    blocked = tmp_path / "file"
    blocked.write_text("in the way")
    with pytest.raises(UnwritableReport, match="--report"):
        write_html(gas_house_result, blocked / "report.html")
