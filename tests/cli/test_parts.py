"""Parsing of options, rounding to an error bar, choice of units, progress."""

from __future__ import annotations

import io
import os
import time

import click
import numpy as np
import pytest
from hypothesis import given
from hypothesis import strategies as st

from oscsolve.cli import progress
from oscsolve.cli.numbers import aligned, fixed
from oscsolve.cli.options import BandType, DegreesType, NumberType
from oscsolve.cli.progress import Progress
from oscsolve.cli.table import period_unit
from oscsolve.pulsation.cache import compile_may_be_due
from oscsolve.units import UNITS


@pytest.mark.parametrize(
    ("text", "degrees"),
    [("0-3,10", (0, 1, 2, 3, 10)), ("2", (2,)), ("3,1,1-2", (1, 2, 3)), (" 0 , 4 ", (0, 4))],
)
def test_degrees_are_sorted_and_each_stands_once(text, degrees):
    assert DegreesType().convert(text, None, None) == degrees


@pytest.mark.parametrize(
    ("text", "band"),
    [
        ("1000:4000", (1000.0, 4000.0, "uHz")),
        ("0.5:3d", (0.5, 3.0, "d")),
        ("1500:100s", (1500.0, 100.0, "s")),
        ("2:400sigma2", (2.0, 400.0, "sigma2")),
        ("1:2mHz", (1.0, 2.0, "mHz")),
        ("5:20c/d", (5.0, 20.0, "c/d")),
        ("10:20 min", (10.0, 20.0, "min")),
        ("1e3:4e3uHz", (1e3, 4e3, "uHz")),
        ("-3:10sigma2", (-3.0, 10.0, "sigma2")),
    ],
)
def test_bands_carry_their_unit(text, band):
    assert tuple(BandType().convert(text, None, None)) == band


def test_every_unit_is_understood():
    for unit in UNITS:
        assert BandType().convert(f"1:2{unit}", None, None).unit == unit


@pytest.mark.parametrize("text", ["", "1", "1:2:3", ":", "a:b", "1:2sec", "1:", "1:1/0"])
def test_what_is_no_band_is_refused(text):
    with pytest.raises(click.BadParameter, match="is no band"):
        BandType().convert(text, None, None)


def test_fractions_are_numbers():
    assert NumberType().convert("5/3", None, None) == 5 / 3


@given(st.floats(1e-3, 1e7), st.floats(1e-12, 1e-2))
def test_a_printed_frequency_is_within_its_error(nu, relative):
    text = fixed(nu, relative * nu)
    assert abs(float(text) - nu) <= max(relative * nu, 5e-14 * nu)
    # One digit fewer would round by more than the error, or there would be no decimals.
    decimals = len(text.partition(".")[2])
    assert decimals == 0 or 10.0 ** -(decimals - 1) > relative * nu


def test_numbers_without_a_usable_error_show_few_digits():
    assert fixed(1234.56789, float("nan")) == "1234.568"
    assert fixed(float("inf"), 1.0) == "inf"
    assert fixed(0.0, 0.1) == "0.0"


def test_decimal_points_stand_below_each_other():
    assert aligned(["1.25", "100", "-3.5"]) == ["  1.25", "100   ", " -3.5 "]
    assert aligned(["1"], "long") == ["   1"]


@pytest.mark.parametrize(
    ("typical", "unit"), [(300.0, "s"), (5000.0, "min"), (20000.0, "h"), (5e5, "d")]
)
def test_the_unit_of_periods_suits_the_list(typical, unit):
    assert period_unit(np.array([0.9, 1.0, 1.1, np.inf]) * typical) == unit


class Terminal(io.StringIO):
    """A stream that says it is a terminal."""

    def isatty(self):
        return True


@pytest.fixture
def compiled(monkeypatch):
    monkeypatch.setattr(progress, "compile_is_due", lambda: False)


@pytest.mark.usefixtures("compiled")
def test_a_short_run_says_nothing():
    stream = io.StringIO()
    with Progress(lambda: None, stream) as told:
        told(0, 2, "degree 0")
    assert stream.getvalue() == ""


@pytest.mark.usefixtures("compiled")
def test_a_long_run_says_where_it_is():
    stream = io.StringIO()
    with Progress(lambda: None, stream, silence=0.01, interval=0.01) as told:
        told(1, 4, "degree 1")
        until = time.monotonic() + 5.0
        while not stream.getvalue() and time.monotonic() < until:
            time.sleep(0.01)
    assert stream.getvalue().startswith("oscsolve: degree 1 (1 of 4 done, 0 s)\n")


@pytest.mark.usefixtures("compiled")
def test_a_terminal_line_is_cleared_at_the_end():
    stream = Terminal()
    with Progress(lambda: None, stream, silence=0.01, interval=0.01) as told:
        told(1, 4, "degree 1")
        until = time.monotonic() + 5.0
        while not stream.getvalue() and time.monotonic() < until:
            time.sleep(0.01)
    assert "\n" not in stream.getvalue()
    assert stream.getvalue().startswith("\roscsolve: degree 1 (1 of 4 done")
    assert stream.getvalue().rsplit("\r", 2)[1].strip() == ""


def test_the_announcement_and_the_compile_come_with_the_first_call(monkeypatch):
    monkeypatch.setattr(progress, "compile_is_due", lambda: True)
    stream, announced = io.StringIO(), []
    with Progress(lambda: announced.append(stream.getvalue()), stream) as told:
        assert announced == []
        told(0, 2, "degree 0")
        told(1, 2, "degree 1")
    assert announced == [""]
    assert "compiling the solver for the first run" in stream.getvalue()


def test_a_compile_is_due_where_no_compiled_code_lies(monkeypatch, tmp_path):
    monkeypatch.delenv("NUMBA_DISABLE_JIT", raising=False)
    monkeypatch.setenv("NUMBA_CACHE_DIR", str(tmp_path))
    assert progress.compile_is_due()
    index = tmp_path / "sweep.count_negative-44.py311.nbi"
    index.write_text("")
    assert not progress.compile_is_due() and not compile_may_be_due()
    os.utime(index, (0, 0))
    assert compile_may_be_due(), "the source is newer than what was compiled of it"
    assert not progress.compile_is_due()
    index.unlink()
    monkeypatch.setenv("NUMBA_DISABLE_JIT", "1")
    assert not progress.compile_is_due()
