"""Several accounts in one file: each line goes to its own account or to nobody, never by guess.

Invented files; expected values are read off them by eye.
"""

from __future__ import annotations

from pathlib import Path

import pytest

from normalize.bills.groups import Group, answers_that_choose, labels, named
from normalize.bills.read import read_bills
from normalize.errors import AmbiguousBills, UnreadableBills


def file_of(folder: Path, text: str) -> Path:
    file = folder / "bills.csv"
    file.write_text(text)
    return file


TAIL = (
    "Account,Start,End,Therms\n"
    "1111005678,2023-01-05,2023-02-06,81\n1111005678,2023-02-06,2023-03-07,70\n"
    "2222005678,2023-03-07,2023-04-06,9\n2222005678,2023-04-06,2023-05-06,8\n"
)


def test_an_ending_of_two_numbers_is_asked_about_and_never_added_up(tmp_path: Path) -> None:
    file = file_of(tmp_path, TAIL)
    with pytest.raises(AmbiguousBills) as asked:
        read_bills(file, rows="5678")
    # Seven digits would be needed; so many of a number are not shown.
    assert 'rows = "account 1" or rows = "account 2"' in str(asked.value)
    assert read_bills(file, rows="account 2").periods.use.tolist() == [9.0, 8.0]
    for ending, use in (("1111005678", [81.0, 70.0]), ("2222005678", [9.0, 8.0])):
        assert read_bills(file, rows=ending).periods.use.tolist() == use


def test_each_choice_of_the_question_answers_it(tmp_path: Path) -> None:
    import re

    text = "Account,Service,Start,End,Usage,Unit\n" + "".join(
        f"{account},{fuel},{a},{b},{use},{unit}\n"
        for account, use in (("900011234", 10), ("800011234", 20), ("North barn", 30))
        for fuel, unit in (("Electric", "kWh"), ("Gas", "therms"))
        for a, b in (("2023-01-05", "2023-02-06"), ("2023-02-06", "2023-03-07"))
    )
    file = file_of(tmp_path, text)
    with pytest.raises(AmbiguousBills) as asked:
        read_bills(file)
    choices = [dict(re.findall(r'(\w+) = "([^"]+)"', part))
               for part in str(asked.value).split(" or ")]  # fmt: skip
    choices = [c for c in choices if c]
    assert len(choices) == 6
    found = [(read_bills(file, **c).periods.use.tolist(), read_bills(file, **c).fuel)
             for c in choices]  # fmt: skip
    assert [u for u, _ in found] == [[10.0] * 2, [10.0] * 2, [20.0] * 2, [20.0] * 2,
                                     [30.0] * 2, [30.0] * 2]  # fmt: skip
    assert [f for _, f in found] == ["electricity", "natural gas"] * 3
    assert "900011234" not in str(asked.value)


def test_a_fuel_named_by_rows_does_not_add_accounts_up(tmp_path: Path) -> None:
    """The same fuel of two accounts: naming the fuel is not enough."""
    text = "Account,Service,Start,End,Usage,Unit\n" + "".join(
        f"{account},{fuel},2023-01-05,2023-02-06,{use},{unit}\n"
        for account, use in (("A1", 10), ("B2", 20))
        for fuel, unit in (("Electric", "kWh"), ("Gas", "therms"))
    )
    with pytest.raises(AmbiguousBills, match="2 accounts"):
        read_bills(file_of(tmp_path, text), rows="Gas")


def test_lines_without_a_number_belong_to_nobody(tmp_path: Path) -> None:
    text = TAIL.replace("1111005678,2023-02-06", ",2023-02-06")
    bills = read_bills(file_of(tmp_path, text), rows="1111005678", end_dates="exclusive")
    assert bills.periods.use.tolist() == [81.0]
    assert any("1 line left out: the line does not say whose it is" in s for s in bills.reading)


def test_lines_without_a_number_belong_to_the_only_account_there_is(tmp_path: Path) -> None:
    text = (
        "Account,Start,End,Therms\n1111005678,2023-01-05,2023-02-06,81\n"
        ",2023-02-06,2023-03-07,70\n,2023-03-07,2023-04-06,60\n"
    )
    assert read_bills(file_of(tmp_path, text)).periods.use.tolist() == [81.0, 70.0, 60.0]


def test_an_account_without_its_meter_on_one_line(tmp_path: Path) -> None:
    """The account has one meter, so its number is enough; with two it is not."""
    one = (
        "Account,Meter,Start,End,Therms\nA1,M7,2023-01-05,2023-02-06,81\n"
        "A1,,2023-02-06,2023-03-07,70\nB2,M8,2023-01-05,2023-02-06,5\n"
        "B2,M8,2023-02-06,2023-03-07,6\n"
    )
    assert read_bills(file_of(tmp_path, one), rows="A1").periods.use.tolist() == [81.0, 70.0]
    two = one + "A1,M9,2023-01-05,2023-02-06,1\nA1,M9,2023-02-06,2023-03-07,2\n"
    assert read_bills(file_of(tmp_path, two), rows="M7", end_dates="exclusive").periods.n == 1


def test_an_unknown_name_lists_those_there_are(tmp_path: Path) -> None:
    with pytest.raises(UnreadableBills, match="wanted one of …5678"):
        read_bills(file_of(tmp_path, TAIL), rows="9999")


def test_labels_are_masked_and_no_two_are_alike() -> None:
    groups = [
        Group(("1111005678", "M1"), "", ()), Group(("2222005678", "M2"), "", ()),
        Group(("3333005678", "M2"), "", ()), Group(("House",), "", ()),
        Group(("…5678 account M2 (1)",), "", ()),
    ]  # fmt: skip
    found = labels(groups)
    assert len(set(found)) == len(groups)
    assert found[3] == "House"
    assert not any("005678" in text for text in found)


def test_the_shortest_ending_that_is_of_one_account_only() -> None:
    groups = [
        Group((n,), "", ()) for n in ("5678", "125678", "99125678", "777")
    ]  # each ends the next
    chosen = answers_that_choose(groups)
    for group, lines in zip(groups, chosen, strict=True):
        assert named(groups, lines["rows"]) == [group]
