"""The command line: how it ends, what it tells on the way, and that nothing is lost."""

from __future__ import annotations

import io
import os
import pathlib
import re
import subprocess
import sys
import time

import pytest

import soiltemp.cli as cli
from soiltemp.cli import main
from soiltemp.errors import DataFileError, SolverError
from tests.helpers.command import ROOT, said
from tests.test_site_run import TEXT

# --- where nothing may be written ---------------------------------------------------------------------------


@pytest.mark.parametrize(
    ("option", "name", "words"),
    [
        ("-o", "r.txt", r"-o .*r\.txt.*; allowed: a name that ends in \.nc"),
        ("-o", "r", r"allowed: a name that ends in \.nc"),
        ("-o", "none/r.nc", "folder that does not exist"),
        ("-o", "folder.nc", "which is a folder"),
        ("-o", "weather.nc", "from which this run reads"),
        ("--picture", "page.nc", r"--picture .*; allowed: a name that ends in \.html"),
        ("--picture", "none/page.html", "folder that does not exist"),
    ],
)
def test_target_is_looked_at_before_the_run(
    option: str,
    name: str,
    words: str,
    tmp_path: pathlib.Path,
    capsys: pytest.CaptureFixture[str],
    monkeypatch: pytest.MonkeyPatch,
) -> None:
    monkeypatch.setattr(cli, "run", pytest.fail)
    (tmp_path / "folder.nc").mkdir()
    (tmp_path / "weather.nc").write_bytes(b"weather")
    site = tmp_path / "a.toml"
    periodic = 'periodic = { mean = "4 degC", amplitude = "17 K", coldest = "01-20" }'
    site.write_text(TEXT.replace(periodic, 'air_temperature = "weather.nc"'))
    assert main(["run", str(site), option, str(tmp_path / name)]) == 2
    out, err = said(capsys)
    assert out == ""
    assert err.count("\n") == 1
    assert re.search(words, err), err
    assert (tmp_path / "weather.nc").read_bytes() == b"weather"


def test_folder_without_the_right_to_write(
    site_file: pathlib.Path, capsys: pytest.CaptureFixture[str], monkeypatch: pytest.MonkeyPatch
) -> None:
    # root may write anywhere, so the answer of the system is stood in for
    monkeypatch.setattr(cli.os, "access", lambda folder, mode: folder != site_file.parent)
    assert main(["run", str(site_file), "-o", str(site_file.parent / "r.nc")]) == 2
    assert "may not be written to" in said(capsys)[1]


def test_result_is_not_written_over_itself(site_file: pathlib.Path, capsys: pytest.CaptureFixture[str]) -> None:
    target = site_file.parent / "r.nc"
    assert main(["run", str(site_file), "--quiet", "-o", str(target)]) == 0
    before = target.read_bytes()
    assert main(["run", str(target), "--quiet", "-o", str(target)]) == 2
    assert "from which this run reads" in said(capsys)[1]
    assert target.read_bytes() == before


def test_file_that_is_no_result(tmp_path: pathlib.Path, capsys: pytest.CaptureFixture[str]) -> None:
    (tmp_path / "r.nc").write_bytes(b"CDF\x01 and then something else")
    assert main(["run", str(tmp_path / "r.nc")]) == 2
    assert said(capsys)[1].count("\n") == 1


# --- other endings ------------------------------------------------------------------------------------------


def raising(error: BaseException) -> object:
    def stand_in(*arguments: object, **options: object) -> None:
        raise error

    return stand_in


def test_ctrl_c_in_the_middle_of_a_run(
    site_file: pathlib.Path, capsys: pytest.CaptureFixture[str], monkeypatch: pytest.MonkeyPatch
) -> None:
    """The interrupt comes out of the solver itself, by way of its progress."""

    def interrupt(self: object, share: float, what: str) -> None:
        if share > 0.3:
            raise KeyboardInterrupt

    monkeypatch.setattr(cli._Progress, "__call__", interrupt)
    target = site_file.parent / "r.nc"
    target.write_bytes(b"old")
    assert main(["run", str(site_file), "-o", str(target)]) == 130
    out, err = said(capsys)
    assert out == ""
    assert err == "soiltemp: stopped by Ctrl-C; nothing was written\n"
    assert target.read_bytes() == b"old"
    assert sorted(os.listdir(site_file.parent)) == ["a.toml", "r.nc"]


def test_ctrl_c_after_a_file_was_written_says_which(
    site_file: pathlib.Path, capsys: pytest.CaptureFixture[str], monkeypatch: pytest.MonkeyPatch
) -> None:
    monkeypatch.setattr(cli, "_draw", raising(KeyboardInterrupt()))
    target = site_file.parent / "r.nc"
    assert (
        main(["run", str(site_file), "--quiet", "-o", str(target), "--picture", str(target.with_suffix(".html"))])
        == 130
    )
    assert said(capsys)[1] == f"soiltemp: stopped by Ctrl-C; already written: {target}\n"


def test_picture_that_fails_leaves_the_result_and_says_so(
    site_file: pathlib.Path, capsys: pytest.CaptureFixture[str], monkeypatch: pytest.MonkeyPatch
) -> None:
    monkeypatch.setattr(cli, "_draw", raising(DataFileError("page: found no room; allowed: room; make room.")))
    target = site_file.parent / "r.nc"
    assert (
        main(["run", str(site_file), "--quiet", "-o", str(target), "--picture", str(target.with_suffix(".html"))]) == 2
    )
    assert said(capsys)[1] == f"soiltemp: page: found no room; allowed: room; make room. (already written: {target})\n"
    assert target.exists()


def test_solver_that_stops_is_our_fault(
    site_file: pathlib.Path, capsys: pytest.CaptureFixture[str], monkeypatch: pytest.MonkeyPatch
) -> None:
    monkeypatch.setattr(cli, "run", raising(SolverError("solver, 3.2 days after the start: stopped;\nno result.")))
    assert main(["run", str(site_file), "--quiet"]) == 1
    err = said(capsys)[1]
    assert err == "soiltemp: our fault, not that of the file: solver, 3.2 days after the start: stopped; no result.\n"


def test_error_that_nobody_foresaw(
    site_file: pathlib.Path, capsys: pytest.CaptureFixture[str], monkeypatch: pytest.MonkeyPatch
) -> None:
    monkeypatch.setattr(cli, "run", raising(ZeroDivisionError("by\nnothing")))
    assert main(["run", str(site_file), "--quiet"]) == 1
    err = said(capsys)[1]
    assert err.count("\n") == 1
    assert re.match(r"soiltemp: our fault, .*ZeroDivisionError \(by.nothing\); nothing was written; .*--debug", err)
    assert main(["run", str(site_file), "--quiet", "--debug"]) == 1
    err = said(capsys)[1]
    assert "Traceback" in err
    assert "ZeroDivisionError: by" in err


def test_debug_shows_where_bad_input_was_found(site_file: pathlib.Path, capsys: pytest.CaptureFixture[str]) -> None:
    site_file.write_text(TEXT.replace("47.2", "94.6"))
    assert main(["check", str(site_file), "--debug"]) == 2
    assert "Traceback" in said(capsys)[1]


# --- progress and notices -----------------------------------------------------------------------------------


class Terminal(io.StringIO):
    """A stream that calls itself a terminal."""

    def isatty(self) -> bool:
        return True


@pytest.fixture
def clock(monkeypatch: pytest.MonkeyPatch) -> list[float]:
    """Seconds that `time.monotonic` tells, to be set."""
    now = [100.0]
    monkeypatch.setattr(cli.time, "monotonic", lambda: now[0])
    return now


def test_short_run_says_nothing(clock: list[float]) -> None:
    for stream in (io.StringIO(), Terminal()):
        progress = cli._Progress(stream)
        progress(0.5, "marching")
        clock[0] += 0.9
        progress(0.9, "marching")
        progress.clear()
        assert stream.getvalue() == ""


def test_long_run_says_what_it_does_and_for_how_long(clock: list[float]) -> None:
    terminal = Terminal()
    progress = cli._Progress(terminal)
    clock[0] += 2.0
    progress(0.2, "finding the periodic start")
    assert terminal.getvalue().strip() == "finding the periodic start: 20 %, about 8 s left"
    progress(0.3, "marching")  # too soon after the last
    assert "30 %" not in terminal.getvalue()
    clock[0] += 2.0
    progress(0.5, "marching")
    assert terminal.getvalue().rsplit("\r", 1)[1].strip() == "marching: 50 %, about 4 s left"
    progress.clear()
    assert terminal.getvalue().endswith("\r")
    assert "\n" not in terminal.getvalue()


def test_in_a_file_a_line_now_and_then(clock: list[float]) -> None:
    log = io.StringIO()
    progress = cli._Progress(log)
    for second in range(31):
        clock[0] = 100.0 + second
        progress(0.01 + second / 40.0, "marching")
    lines = log.getvalue().split("\n")
    assert lines[0].startswith("marching: 4 %")
    assert len(lines) == 4  # after 1, 11 and 21 s, and the end of the last line
    assert "\r" not in log.getvalue()


def test_progress_and_notices_go_to_stderr_unless_quiet(
    site_file: pathlib.Path, capsys: pytest.CaptureFixture[str], monkeypatch: pytest.MonkeyPatch
) -> None:
    asked: list[object] = []
    monkeypatch.setattr(cli, "_prepare", asked.append)
    monkeypatch.setattr(cli, "_QUIET_FOR", -1.0)
    assert main(["run", str(site_file)]) == 0
    out, err = said(capsys)
    assert err.startswith("marching: ")
    assert "marching" not in out
    assert main(["run", str(site_file), "--quiet"]) == 0
    assert said(capsys)[1] == ""
    assert [stream is None for stream in asked] == [False, True]


def test_compiling_is_announced(monkeypatch: pytest.MonkeyPatch) -> None:
    monkeypatch.setattr(cli, "_COMPILING_FOR", 0.02)
    monkeypatch.setattr(cli, "solve", lambda *arguments, **options: time.sleep(0.3))
    stream = io.StringIO()
    cli._prepare(stream)
    assert re.fullmatch(r"soiltemp: preparing the solver: the first run compiles it, about \d+ s\n", stream.getvalue())
    cli._prepare(None)  # --quiet


def test_compiled_solver_is_not_announced(monkeypatch: pytest.MonkeyPatch) -> None:
    monkeypatch.setattr(cli, "_COMPILING_FOR", 0.1)
    monkeypatch.setattr(cli, "solve", lambda *arguments, **options: None)
    stream = io.StringIO()
    cli._prepare(stream)
    time.sleep(0.3)
    assert stream.getvalue() == ""


def test_the_solver_itself_is_prepared() -> None:
    cli._prepare(None)
    begin = time.monotonic()
    cli._prepare(None)
    assert time.monotonic() - begin < cli._COMPILING_FOR  # some ms; nothing is compiled twice


# --- as a program of its own --------------------------------------------------------------------------------


def program(arguments: list[str], **options: object) -> subprocess.CompletedProcess[str]:
    command = [sys.executable, "-m", "soiltemp", *arguments]
    environment = {**os.environ, "PYTHONPATH": str(ROOT), "PYTHONIOENCODING": "ascii"}
    return subprocess.run(command, env=environment, text=True, stderr=subprocess.PIPE, check=False, **options)  # type: ignore[call-overload]  # options of run


def test_as_a_module_with_a_terminal_that_lacks_letters(site_file: pathlib.Path) -> None:
    site_file.write_text(TEXT.replace("Made up", "Süd"), encoding="utf-8")
    done = program(["check", str(site_file)], stdout=subprocess.PIPE)
    assert (done.returncode, done.stderr) == (0, "")
    assert done.stdout.startswith("S\\xfcd: latitude 47.2")


def test_reader_that_closes_the_pipe(site_file: pathlib.Path) -> None:
    reader, writer = os.pipe()
    os.close(reader)
    done = program(["check", str(site_file)], stdout=writer)
    os.close(writer)
    assert (done.returncode, done.stderr) == (141, "")


def test_version(capsys: pytest.CaptureFixture[str]) -> None:
    with pytest.raises(SystemExit, match="0"):  # as --help ends
        main(["--version"])
    assert said(capsys)[0].startswith("soiltemp")


def test_check_notes_an_unusual_n_factor(site_file: pathlib.Path, capsys: pytest.CaptureFixture[str]) -> None:
    assert main(["check", str(site_file)]) == 0
    assert "published n-factors of freezing" not in said(capsys)[0]
    site_file.write_text(TEXT.replace("freezing_n_factor = 0.5", "freezing_n_factor = 0.1"))
    assert main(["check", str(site_file)]) == 0
    assert "published n-factors of freezing lie between 0.25 and 1" in " ".join(said(capsys)[0].split())
