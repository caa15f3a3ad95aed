"""``oscsolve grid`` on the command line: what it says where, and what it refuses."""

from __future__ import annotations

import io

import pytest

import oscsolve
from oscsolve.cli.grid_text import GridTold, duration, progress_text, rate_text, summary_lines
from oscsolve.grid import GridProgress, GridSummary
from oscsolve.grid.forecast import Forecast, Sampled

ASKED = ("--degrees", "0", "--band", "3:30sigma2", "--workers", "1")


@pytest.fixture
def folder(tmp_path):
    """Three models of the field, one of them damaged, and a table of parameters."""
    made = tmp_path / "field"
    made.mkdir()
    oscsolve.write_model(oscsolve.polytrope(1.5), made / "lantern-1.fgong")
    oscsolve.write_model(oscsolve.polytrope(2.5), made / "lantern-10.fgong")
    (made / "lantern-9.fgong").write_text("damaged\n")
    (made / "table.csv").write_text("model,mass,age\nlantern-1,1.0,4\nlantern-10,1.2,\nx,1,1\n")
    return made


def test_a_grid_goes_from_a_forecast_to_a_store_that_goes_on(run, folder, tmp_path):
    store = tmp_path / "grid.h5"
    command = ("grid", folder, "--store", store, "--table", folder / "table.csv", *ASKED)
    told = run(*command, "--dry-run")
    assert (told.status, store.exists()) == (0, False)
    assert list(tmp_path.iterdir()) == [folder]
    lines = told.out.splitlines()
    assert lines[0] == "models     3 in 1 folder"
    assert lines[1] == "to solve   3"
    assert lines[2].startswith("sample     lantern-1: ") and lines[2].endswith(" modes")
    assert "in no known format" in lines[3]
    assert lines[-1].startswith("time       about ") and "on 1 worker" in lines[-1]

    ended = run(*command)
    assert ended.status == 1
    assert ended.out.splitlines()[:2] == [
        f"store      {store}",
        "models     3: 2 complete, 1 failed",
    ]
    errors = [line for line in ended.err.splitlines() if "models," not in line]
    assert errors[0] == f"oscsolve: note: {folder / 'table.csv'}: 1 line(s) fit no model"
    assert errors[1] == f"oscsolve: note: {folder / 'table.csv'}: 1 model(s) have no line"
    assert errors[2].startswith(f"oscsolve: failed: lantern-9: {folder}/lantern-9.fgong: this text")
    assert len(errors) == 3
    grid = oscsolve.load_grid(store)
    assert list(grid.name) == ["lantern-1", "lantern-9", "lantern-10"]
    assert [dict(row.parameters) for row in grid] == [{"mass": 1.0, "age": 4.0}, {}, {"mass": 1.2}]

    oscsolve.write_model(oscsolve.polytrope(2.0), folder / "lantern-9.fgong", overwrite=True)
    assert "kept       2 that are in the store\nto solve   1\n" in run(*command, "--dry-run").out
    ended = run(*command)
    assert ended.status == 0
    assert "models     3: 3 complete\nkept       2 that were in the store before\n" in ended.out
    assert oscsolve.load_grid(store).finished


@pytest.mark.parametrize(
    ("arguments", "wanted"),
    [
        (["nothing"], "nothing: no such file or folder"),
        (["{folder}", "--store", "grid.txt"], "the name must end in .h5 or .hdf5"),
        (["{folder}", "--store", "none/grid.h5"], "there is no folder none; make it first"),
        (["{folder}", "--workers", "0"], "0 is not in the range x>=1"),
        (["{folder}", "--workers", "2", "--cluster", "tcp://a:1"], "give one"),
        (["{folder}", "--table", "none.csv"], "none.csv"),
        (["{folder}", "--band", "0:30"], "the band begins at 0 uHz; for l > 0"),
        (["{folder}", "--tolerance", "1e-20"], "tolerance must be from 1e-13"),
        (["{folder}", "--tolerance", "1e-20", "--dry-run"], "tolerance must be from 1e-13"),
        ([], "Missing argument 'MODEL...'"),
    ],
)
def test_wrong_usage_is_one_line(refused, folder, tmp_path, monkeypatch, arguments, wanted):
    monkeypatch.chdir(tmp_path)
    filled = [argument.format(folder=folder) for argument in arguments]
    store = [] if "--store" in filled else ["--store", "grid.h5"]
    assert wanted in refused("grid", *filled, *store)
    assert [entry.name for entry in tmp_path.iterdir()] == ["field"]


def test_the_store_is_asked_for(refused, folder):
    assert "Missing option '--store'" in refused("grid", folder)


@pytest.mark.parametrize(
    ("seconds", "text"),
    [
        (0.26, "0.3 s"),
        (75.0, "75 s"),
        (1500.0, "25 min"),
        (7500.0, "2 h 05 min"),
        (86399.0 * 2, "48 h 00 min"),
        (200_000.0, "2 d 8 h"),
    ],
)
def test_times_are_told_as_people_do(seconds, text):
    assert duration(seconds) == text


def test_rates_are_handy_numbers():
    assert [rate_text(rate) for rate in (123.4, 1.0, 0.5, 0.01)] == [
        "123 a second",
        "1 a second",
        "30 a minute",
        "36 an hour",
    ]


def test_progress_tells_rate_and_time_left():
    seen = GridProgress(done=50, kept=10, failed=2, total=160, workers=4)
    assert progress_text(seen, 25.0) == (
        "60 of 160 models, 10 of them from before, 2 failed, 4 workers, 2 a second, about 50 s left"
    )
    unknown = GridProgress(done=0, kept=0, failed=0, total=None, workers=1)
    assert progress_text(unknown, 3.0) == "0 models, 1 worker"


def test_notes_do_not_mix_with_the_line_of_progress():
    stream = io.StringIO()
    stream.isatty = lambda: True
    with GridTold(stream=stream, silence=0.0, interval=0.01) as told:
        told.tell(GridProgress(1, 0, 0, 10, 1))
        while "1 of 10" not in stream.getvalue():
            pass
        told.note("a worker died\nwith a model")
    after = stream.getvalue().partition("oscsolve: a worker died with a model\n")
    assert after[1] and after[0].endswith(" \r")


def test_a_summary_names_what_is_there(tmp_path):
    summary = GridSummary(tmp_path / "g.h5", 90, 1, 9, 60, 40, 30.0, 0.97, 0.95)
    assert not summary.all_complete
    assert list(summary_lines(summary))[1:] == [
        "models     100: 90 complete, 1 incomplete, 9 failed",
        "kept       40 that were in the store before",
        "solved     60 in 30 s, 2 a second",
        "workers    95 % of their time in the solver",
    ]


def test_a_forecast_takes_no_more_workers_than_models_and_leaves_failures_out():
    sample = (Sampled("a", 2.0, 10, ""), Sampled("b", 0.0, 0, "bad"), Sampled("c", 4.0, 9, ""))
    assert Forecast(100, 1, 0, 100, 10, sample).seconds == (30.0, 20.0, 40.0)
    assert Forecast(2, 1, 0, 2, 10, sample).seconds == (3.0, 2.0, 4.0)
    assert Forecast(0, 0, 0, 0, 10, ()).seconds == (0.0, 0.0, 0.0)
