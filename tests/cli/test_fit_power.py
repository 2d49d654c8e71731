"""``pacing fit-power``: text, JSON, picture, errors."""

from __future__ import annotations

import json
from pathlib import Path

import pytest
import typer

from pacing.cli.fit_power import fit_power
from pacing.errors import UnusableInputError

EFFORTS = """duration_s,power_w,date,position
180,387,2031-05-02,aero bars
420,334,2031-05-04,aero bars
720,312,2031-05-09,aero bars
1200,296,2031-05-12,aero bars
600,325,2031-05-15,upright
"""


@pytest.fixture
def efforts(tmp_path: Path) -> Path:
    file = tmp_path / "efforts.csv"
    file.write_text(EFFORTS, encoding="utf-8")
    return file


def run(*arguments: object) -> None:
    app = typer.Typer(rich_markup_mode=None, pretty_exceptions_enable=False)
    app.command()(fit_power)
    app(args=[str(argument) for argument in arguments], standalone_mode=False)


def test_the_text_fits_the_screen_and_says_everything(
    efforts: Path, capsys: pytest.CaptureFixture[str]
) -> None:
    run(efforts)
    text = capsys.readouterr().out
    assert max(map(len, text.splitlines())) <= 80
    for said in ("critical power", "95 %", "off the curve", "work against time", "upright: 1.029"):
        assert said in text
    assert "medical clearance" in text
    assert "[uncertainty]" in text


def test_json_has_the_promised_keys(efforts: Path, capsys: pytest.CaptureFixture[str]) -> None:
    run(efforts, "--json")
    document = json.loads(capsys.readouterr().out)
    assert document["schema"] == "power-fit/1"
    promised = (
        "critical_power_w critical_power_se_w w_prime_j w_prime_se_j covariance form efforts"
        " shares warnings fragment"
    )
    assert set(promised.split()) <= set(document)
    first = document["efforts"][0]
    assert {"duration_s", "power_w", "residual_w", "flagged"} <= set(first)
    assert first["flagged"] is False
    assert document["form"] == "two-parameter"
    assert document["critical_power_se_w"] == pytest.approx(document["covariance"][0][0] ** 0.5)


def test_errors_are_null_with_two_efforts(
    tmp_path: Path, capsys: pytest.CaptureFixture[str]
) -> None:
    file = tmp_path / "two.csv"
    file.write_text("duration_s,power_w\n180,387\n720,309\n", encoding="utf-8")
    run(file, "--json")
    document = json.loads(capsys.readouterr().out)
    assert document["critical_power_w"] == pytest.approx(283.0)
    assert document["critical_power_se_w"] is None
    assert document["w_prime_se_j"] is None
    assert document["covariance"] is None


@pytest.mark.parametrize("suffix", [".png", ".pdf", ".svg"])
def test_a_picture_is_drawn_whole(efforts: Path, tmp_path: Path, suffix: str) -> None:
    picture = tmp_path / f"fit{suffix}"
    run(efforts, "-o", picture)
    assert picture.stat().st_size > 5_000
    assert not list(tmp_path.glob(".*part"))


def test_a_picture_of_two_efforts_has_no_band(tmp_path: Path) -> None:
    file = tmp_path / "two.csv"
    file.write_text("duration_s,power_w\n180,387\n720,309\n", encoding="utf-8")
    run(file, "-o", tmp_path / "fit.svg")
    assert "too few efforts for a band" in (tmp_path / "fit.svg").read_text(encoding="utf-8")


def test_a_picture_that_cannot_be_written_is_refused_before_any_work(tmp_path: Path) -> None:
    with pytest.raises(UnusableInputError, match="a name that ends in"):
        run(tmp_path / "no-such.csv", "-o", tmp_path / "fit.bmp")


def test_efforts_without_a_curve_name_the_file(tmp_path: Path) -> None:
    file = tmp_path / "one.csv"
    file.write_text("duration_s,power_w\n180,387\n", encoding="utf-8")
    with pytest.raises(UnusableInputError, match=r"one\.csv: 1 effort of one duration"):
        run(file)


def test_tests_long_apart_are_warned_of(tmp_path: Path, capsys: pytest.CaptureFixture[str]) -> None:
    file = tmp_path / "apart.csv"
    file.write_text(
        "duration_s,power_w,date\n180,387,2031-01-02\n720,309,2031-05-02\n", encoding="utf-8"
    )
    run(file)
    assert "120 days apart" in capsys.readouterr().out


def test_a_ride_gives_its_highest_means_and_says_that_it_is_no_test(
    tmp_path: Path, capsys: pytest.CaptureFixture[str]
) -> None:
    file = tmp_path / "ride.csv"
    rows = (f"{second},{350 if second < 180 else 250}" for second in range(1500))
    file.write_text("time_s,power_w\n" + "\n".join(rows), encoding="utf-8")
    run(file, "--json")
    document = json.loads(capsys.readouterr().out)
    means = {row["duration_s"]: row["power_w"] for row in document["highest_mean_power"]}
    assert means[180.0] == pytest.approx(350.0)
    assert means[360.0 if 360.0 in means else 600.0] == pytest.approx(280.0)
    assert "lower bound" in document["warnings"][0].replace("\n", " ")


def test_a_short_ride_gives_its_means_and_no_fit(
    tmp_path: Path, capsys: pytest.CaptureFixture[str]
) -> None:
    file = tmp_path / "ride.csv"
    file.write_text(
        "time_s,power_w\n" + "\n".join(f"{second},240" for second in range(100)), encoding="utf-8"
    )
    run(file, "--json")
    document = json.loads(capsys.readouterr().out)
    assert document["critical_power_w"] is None
    assert document["fragment"] is None
    assert any("No critical power from this ride" in said for said in document["warnings"])
    with pytest.raises(UnusableInputError, match="no fit to draw"):
        run(file, "-o", tmp_path / "fit.png")
