"""The command line, as a process of its own: what it prints, how it refuses, that it needs no Qt and no screen."""

from __future__ import annotations

import csv
import io
import json
import os
import subprocess
import sys
from pathlib import Path

import pytest

from spreadgui import shipped
from spreadgui.book.writing import write_book
from spreadgui.pricing import bjerksund_stensland, kirk, yardstick
from tests.books import book_of, cap, season, spark

DEMO = shipped.sample_book("ardenmoor_winter")
NO_SCREEN = {
    key: value for key, value in os.environ.items() if key not in ("DISPLAY", "WAYLAND_DISPLAY", "QT_QPA_PLATFORM")
}


def run(*arguments: object, **options: object) -> subprocess.CompletedProcess[str]:
    command = [sys.executable, "-W", "error", "-m", "spreadgui", *map(str, arguments)]
    return subprocess.run(command, capture_output=True, text=True, timeout=120, env=NO_SCREEN, check=False, **options)


def table_of(text: str) -> list[dict[str, str]]:
    return list(csv.DictReader(io.StringIO(text)))


@pytest.fixture
def book_file(tmp_path: Path) -> Path:
    path = tmp_path / "book.json"
    write_book(book_of(spark(), season(), cap(), spark(name="unfinished", expiry=None)), path)
    return path


def test_the_demo_book_is_valued_without_a_screen() -> None:
    done = run("value", DEMO, "--csv", "-")
    assert (done.returncode, done.stderr) == (0, "")
    rows = table_of(done.stdout)
    assert len(rows) >= 40
    assert {row["state"] for row in rows} == {"current"}


def test_the_table_agrees_with_the_formulas_called_by_hand(book_file: Path) -> None:
    row = table_of(run("value", book_file, "--csv", "-").stdout)[0]
    cell = {key: float(row[key]) for key in (
        "forward_long", "forward_short", "short_ratio", "strike", "vol_long", "vol_short", "correlation", "years",
        "discount", "kirk", "bjerksund_stensland", "yardstick", "quantity", "position_value",
    )}  # fmt: skip
    arguments = (
        cell["forward_long"], cell["short_ratio"] * cell["forward_short"], cell["strike"], cell["vol_long"],
        cell["vol_short"], cell["correlation"], cell["years"], cell["discount"],
    )  # fmt: skip
    for method in (kirk, bjerksund_stensland, yardstick):
        key = method.__name__.rpartition(".")[2]
        assert cell[key] == pytest.approx(float(method.value(*arguments)), rel=1e-13)
    assert cell["position_value"] == pytest.approx(cell["quantity"] * cell["yardstick"])


def test_a_row_that_cannot_be_priced_says_so_and_the_others_are_priced(book_file: Path) -> None:
    done = run("value", book_file, "--csv", "-")
    rows = table_of(done.stdout)
    assert [row["state"] for row in rows] == ["current", "current", "current", "incomplete"]
    assert rows[3]["reason"] == "the expiry is missing"
    assert rows[3]["position_value"] == ""
    assert done.returncode == 0


def test_another_date_moves_the_valuation(book_file: Path) -> None:
    rows = table_of(run("value", book_file, "--csv", "-", "--date", "2026-12-15").stdout)
    assert float(rows[0]["years"]) == pytest.approx(14 / 365)


def test_json_and_csv_files_hold_the_same_numbers(book_file: Path, tmp_path: Path) -> None:
    done = run("value", book_file, "--csv", tmp_path / "out.csv", "--json", tmp_path / "out.json")
    assert (done.returncode, done.stdout) == (0, "")
    rows = table_of((tmp_path / "out.csv").read_text())
    told = json.loads((tmp_path / "out.json").read_text())
    assert [position["yardstick"] for position in told["positions"][:3]] == [
        float(row["yardstick"]) for row in rows[:3]
    ]
    assert told["positions"][3]["yardstick"] is None
    assert told["book_value"] == pytest.approx(sum(float(row["position_value"]) for row in rows[:3]))


def test_without_a_target_a_table_for_reading_is_printed(book_file: Path) -> None:
    done = run("value", book_file)
    assert "spark" in done.stdout
    assert "Book value" in done.stdout
    assert "3 current, 1 incomplete" in done.stdout


def test_a_list_of_positions_with_their_own_marks_is_valued(tmp_path: Path) -> None:
    path = tmp_path / "positions.csv"
    path.write_text(
        "kind,side,quantity,expiry,own_forward_long,own_forward_short,own_vol_long,own_vol_short,own_correlation,strike\n"
        "call,long,10,2027-12-01,112,103,0.3,0.45,0.5,-20\n"
    )
    row = table_of(run("value", path, "--date", "2026-12-01", "--csv", "-").stdout)[0]
    expected = float(yardstick.value(112, 103, -20, 0.3, 0.45, 0.5, 1.0))
    assert float(row["yardstick"]) == pytest.approx(expected, rel=1e-12)


def test_check_finds_nothing_in_the_books_that_come_with_the_program() -> None:
    for name in ("ardenmoor_winter", "one_spark"):
        done = run("check", shipped.sample_book(name))
        assert (done.returncode, done.stderr) == (0, "")


def test_check_tells_every_fault_with_its_place(tmp_path: Path) -> None:
    path = tmp_path / "book.json"
    write_book(book_of(spark(long_leg="Nowhere"), spark(own_correlation=2.0, expiry=None)), path)
    done = run("check", path)
    assert done.returncode == 2
    assert [line.partition(":")[0] for line in done.stdout.splitlines()] == [
        "positions[0].long_leg", "positions[1].expiry", "positions[1].own_correlation",
    ]  # fmt: skip


BROKEN = {
    "empty": b"",
    "blank": b" \n\n",
    "truncated": DEMO.read_bytes()[:3000],
    "binary": bytes(range(256)) * 40,
    "newer": DEMO.read_bytes().replace(b'"version": 2', b'"version": 99'),
    "foreign": b'{"hello": "world"}',
    "nested": b"[" * 50_000,
    "wrong entry": DEMO.read_bytes().replace(b'"zero_rate": 0.032', b'"zero_rate": "3.2 %"'),
}


@pytest.mark.parametrize("command", ["value", "check", "picture"])
@pytest.mark.parametrize("name", BROKEN)
def test_a_broken_file_gets_one_clear_line_and_nothing_is_written(tmp_path: Path, command: str, name: str) -> None:
    path, target = tmp_path / "book.json", tmp_path / "out"
    path.write_bytes(BROKEN[name])
    options = {"value": ("--csv", target), "check": (), "picture": ("--png", target)}[command]
    done = run(command, path, *options)
    assert done.returncode == 2
    assert len(done.stderr.splitlines()) == 1
    assert "Traceback" not in done.stderr
    assert done.stdout == ""
    assert not target.exists()


@pytest.mark.parametrize(
    ("arguments", "said"),
    [
        (("value", "absent.json"), "absent.json: there is no such file"),
        (("value", "."), ".: this is a folder, not a file"),
        (("value", DEMO, "--date", "tomorrow"), "--date: expected a day written as 2027-01-15"),
        (("value", DEMO, "--csv", "absent/out.csv"), "absent/out.csv: cannot be written"),
        (("value", DEMO, "--csv", "-", "--json", "-"), "only one of --csv and --json"),
        (("picture", DEMO, "--png", "out.png", "--size", "large"), "--size: expected WIDTHxHEIGHT"),
        (("picture", DEMO, "--png", "out.png", "--row", "999"), "--row: expected a number from 1 to 58, got 999"),
        (("picture", DEMO), "the following arguments are required: --png"),
        (("value",), "the following arguments are required: BOOK"),
        (("check", DEMO, "more"), "unrecognized arguments: more"),
        (("absent.json",), "absent.json: there is no such file"),
    ],
    ids=lambda value: None if isinstance(value, tuple) else value[:20],
)
def test_a_wrong_argument_gets_one_clear_line(tmp_path: Path, arguments: tuple[object, ...], said: str) -> None:
    done = run(*arguments, cwd=tmp_path)
    assert done.returncode == 2
    assert said in done.stderr
    assert "Traceback" not in done.stderr
    assert len(done.stderr.splitlines()) == 1


@pytest.mark.parametrize(("command", "option"), [("value", "--csv"), ("value", "--json"), ("picture", "--png")])
def test_the_book_itself_is_never_written_over(book_file: Path, command: str, option: str) -> None:
    before = book_file.read_bytes()
    done = run(command, book_file, option, book_file)
    assert done.returncode == 2
    assert "is the book itself" in done.stderr
    assert book_file.read_bytes() == before


def test_a_closed_standard_output_is_told_of_in_one_line(book_file: Path) -> None:
    command = f"{sys.executable} -m spreadgui value {book_file} --csv - >&-"
    done = subprocess.run(command, shell=True, capture_output=True, text=True, timeout=60, check=False)
    assert done.returncode == 2
    assert done.stderr == "spreadgui: there is no standard output to write to\n"


def test_every_fault_of_a_list_of_positions_is_told_with_its_line(tmp_path: Path) -> None:
    path = tmp_path / "positions.csv"
    path.write_text("side,kind,quantity,expiry,strike\nlong,call,1,2027-01-01,x\nhold,call,y,2027-01-01,1\n")
    done = run("value", path)
    assert done.returncode == 2
    assert done.stderr.splitlines() == [
        'line 2, strike: expected a number, got "x"',
        'line 3, side: expected one of long, short, got "hold"',
        'line 3, quantity: expected a number, got "y"',
    ]


def test_without_a_screen_the_window_says_so_in_one_line_and_points_on() -> None:
    done = run()
    assert done.returncode == 0
    (line,) = done.stderr.splitlines()
    assert "no display" in line
    assert "value" in line
    assert "picture" in line


def test_value_and_check_run_without_qt(book_file: Path) -> None:
    blocked = "import sys; sys.modules['PySide6'] = None; sys.modules['pyqtgraph'] = None; "
    for arguments in (["value", str(book_file), "--csv", "-"], ["check", str(DEMO)]):
        script = f"{blocked}from spreadgui.command import main; sys.exit(main({arguments!r}))"
        done = subprocess.run([sys.executable, "-c", script], capture_output=True, text=True, timeout=60, check=False)
        assert (done.returncode, done.stderr) == (0, "")


def test_a_reader_that_goes_away_is_no_error() -> None:
    command = f"{sys.executable} -m spreadgui value {DEMO} --csv - | head -n 1"
    done = subprocess.run(command, shell=True, capture_output=True, text=True, timeout=60, check=False)
    assert done.stderr == ""
    assert done.stdout.startswith("name,")


@pytest.mark.parametrize("size", [(1280, 800), (640, 480), (2400, 900)], ids=str)
def test_a_picture_is_drawn_without_a_screen(tmp_path: Path, size: tuple[int, int]) -> None:
    target = tmp_path / "out.png"
    done = run("picture", DEMO, "--png", target, "--size", f"{size[0]}x{size[1]}")
    assert (done.returncode, done.stdout, done.stderr) == (0, "", "")
    data = target.read_bytes()
    assert data.startswith(b"\x89PNG")
    assert (int.from_bytes(data[16:20]), int.from_bytes(data[20:24])) == size
