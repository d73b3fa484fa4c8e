"""Opening a stranger's file: what bills and weather share."""

from __future__ import annotations

from pathlib import Path

import pytest

from normalize.errors import MissingFile, UnreadableBills, UnreadableWeather
from normalize.text_files import decoded, encoding_of, read_bytes

TEXT = "Début;Fin;Énergie\n2023-01-05;2023-02-06;81\n"


@pytest.mark.parametrize(
    ("codec", "found"),
    [("utf-8", "utf-8-sig"), ("utf-8-sig", "utf-8-sig"), ("cp1252", "cp1252"),
     ("utf-16", "utf-16"), ("utf-16-le", "utf-16-le"), ("utf-16-be", "utf-16-be")],
)  # fmt: skip
def test_text_comes_back_from_any_encoding(codec: str, found: str) -> None:
    data = TEXT.encode(codec)
    assert encoding_of(data) == found
    assert decoded(data) == TEXT


def test_what_has_no_encoding_still_decodes() -> None:
    assert decoded(bytes(range(128, 256))).count("\ufffd") == 5  # cp1252 leaves five undefined
    assert encoding_of(b"") == "ascii"


def test_each_room_gets_its_own_error(tmp_path: Path) -> None:
    file = tmp_path / "a.csv"
    for error in (UnreadableBills, UnreadableWeather):
        with pytest.raises(error, match="this is a folder"):
            read_bytes(tmp_path, most=10, wanted="a table", error=error)
        file.write_bytes(b"\xef\xbb\xbf \n\0")
        with pytest.raises(error, match="the file is empty"):
            read_bytes(file, most=10, wanted="a table", error=error)
        file.write_bytes(b"x" * 11)
        with pytest.raises(error, match="wanted at most 0 MB"):
            read_bytes(file, most=10, wanted="a table", error=error)
        with pytest.raises(error, match="cannot be opened"):
            read_bytes("a\0b", most=10, wanted="a table", error=error)
    with pytest.raises(MissingFile, match="no such file"):
        read_bytes(tmp_path / "b.csv", most=10, wanted="a table", error=UnreadableBills)
    file.write_bytes(b"x" * 10)
    assert read_bytes(file, most=10, wanted="a table", error=UnreadableBills) == b"x" * 10
