"""Reading a table of efforts."""

from __future__ import annotations

from datetime import date
from pathlib import Path

import pytest

from pacing.errors import UnusableInputError
from pacing.field.efforts import read_efforts


def _file(tmp_path: Path, text: str) -> Path:
    file = tmp_path / "efforts.csv"
    file.write_text(text, encoding="utf-8")
    return file


def test_a_table_is_read_with_its_columns_in_any_order(tmp_path: Path) -> None:
    efforts = read_efforts(
        _file(
            tmp_path,
            "\ufeffpower_w, date ,duration_s,note\n387,2031-05-02,180,windy\n\n309,,720,\n",
        )
    )
    assert efforts.duration_s == (180.0, 720.0)
    assert efforts.power_w == (387.0, 309.0)
    assert efforts.date == (date(2031, 5, 2), None)
    assert efforts.position == ("", "")


@pytest.mark.parametrize(
    ("text", "message"),
    [
        ("", "the file is empty"),
        ("duration_s\n180\n", "line 1: no column power_w"),
        ("duration_s,power_w\n", "no efforts; expected one line for each effort"),
        ("duration_s,power_w\n180,387\n720,fast\n", "line 3: power_w: 'fast'; expected a number"),
        ("duration_s,power_w\n180\n", "line 2: power_w: ''"),
        ("duration_s,power_w\n3,387\n", "line 2: duration_s: '3'; expected a number from 5 to"),
        ("duration_s,power_w\n180,nan\n", "line 2: power_w: 'nan'"),
        ("duration_s,power_w,date\n180,387,May\n", "line 2: date: 'May'; expected a date such"),
        ("duration_s,power_w,position\n180,387,low\n720,309,\n", "position: a position for some"),
    ],
)
def test_a_bad_table_is_refused_with_the_line(tmp_path: Path, text: str, message: str) -> None:
    with pytest.raises(UnusableInputError, match=message):
        read_efforts(_file(tmp_path, text))


def test_a_missing_file_is_said_so(tmp_path: Path) -> None:
    with pytest.raises(UnusableInputError, match=r"none\.csv: cannot be read \(No such file"):
        read_efforts(tmp_path / "none.csv")
