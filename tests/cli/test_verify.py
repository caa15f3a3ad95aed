"""``oscsolve modes --verify``: what it prints, and how it ends."""

from __future__ import annotations

import json

import numpy as np
import pytest

import oscsolve

BAND = ("--degrees", "0-2", "--band", "2:40sigma2")


@pytest.fixture
def doubted(monkeypatch, handmade_modes):
    """Makes the solver return a list whose second opinion differs in two modes."""
    modes = handmade_modes()
    second = modes.nu.copy()
    second[1] += 1e-3
    second[4] = np.nan
    modes = handmade_modes(nu_second=second, nu_second_error=np.full(5, 1e-9))
    monkeypatch.setattr(oscsolve, "solve_modes", lambda *_, **__: modes)
    return modes


def test_agreement_is_told_with_the_largest_difference(run, polytrope_file):
    ended = run("modes", polytrope_file, *BAND, "--verify")
    assert ended.status == 0
    total = len(ended.rows)
    assert f"# verify   {total} of {total} modes agree within both error bars" in ended.out
    assert "# verify   second opinion by shooting" in ended.out
    (line,) = [line for line in ended.out.splitlines() if "largest relative difference" in line]
    assert float(line.split("difference")[1].split()[0]) < 1e-10


def test_modes_that_differ_are_named_and_end_with_1(run, polytrope_file, doubted):
    ended = run("modes", polytrope_file, "--verify")
    assert ended.status == 1
    assert doubted.complete
    assert "3 of 5 modes agree within both error bars, 2 DO NOT:" in ended.out
    assert "#          l = 0, n = 2; l = 1, n = 12" in ended.out


def test_json_holds_both_opinions(run, polytrope_file, doubted):
    ended = run("modes", polytrope_file, "--verify", "--json")
    assert ended.status == 1
    document = json.loads(ended.out)
    assert [mode["nu_second"] for mode in document["modes"]][4] is None
    assert document["units"]["modes"]["nu_second"] == "uHz"
    second = document["checks"]["second_opinion"]
    assert second["differ"] == [{"degree": 0, "order": 2}, {"degree": 1, "order": 12}]
    assert second["order"] == 2


def test_csv_holds_both_opinions(run, polytrope_file, doubted):
    lines = run("modes", polytrope_file, "--verify", "--csv", "-").out.splitlines()
    (heading,) = [line for line in lines if line.startswith("degree,")]
    assert heading.endswith(",nu_second,nu_second_error")
    row = lines[lines.index(heading) + 1].split(",")
    assert float(row[-2]) == doubted.nu_second[0]


def test_nothing_is_said_unasked(run, polytrope_file):
    assert "verify" not in run("modes", polytrope_file, *BAND).out
