"""Files damaged in every way that comes to mind: each is read, or refused in one line.

By default a few hundred mutations; OSCSOLVE_MUTATIONS=100000 runs as many, always the same ones.
"""

from __future__ import annotations

import os
import random
from collections.abc import Callable

import pytest

import oscsolve
from oscsolve.errors import OscsolveError

MUTATIONS = int(os.environ.get("OSCSOLVE_MUTATIONS", "400"))
#: What may stand in the place of a number.
ODD = [
    "NaN", "Infinity", "-Infinity", "***************", "1e999", "-1", "0", "", "1D+05", "1.0E-400",
    "abc", "9" * 400, "-0.0", "\uff11", "\x00", "1,5", "1e", "--", "+", "999999999", "2.5",
]  # fmt: skip
#: Longest message that still counts as one line to read.
LONGEST = 1200


def cut(rng: random.Random, lines: list[str]) -> list[str]:
    return lines[: rng.randrange(len(lines))]


def drop(rng: random.Random, lines: list[str]) -> list[str]:
    del lines[rng.randrange(len(lines))]
    return lines


def repeat(rng: random.Random, lines: list[str]) -> list[str]:
    at = rng.randrange(len(lines))
    return [*lines[:at], lines[at], *lines[at:]]


def swap(rng: random.Random, lines: list[str]) -> list[str]:
    i, j = rng.randrange(len(lines)), rng.randrange(len(lines))
    lines[i], lines[j] = lines[j], lines[i]
    return lines


def odd_field(rng: random.Random, lines: list[str]) -> list[str]:
    at = rng.randrange(len(lines))
    fields = lines[at].split(" ")
    fields[rng.randrange(len(fields))] = rng.choice(ODD)
    lines[at] = " ".join(fields)
    return lines


def odd_head(rng: random.Random, lines: list[str]) -> list[str]:
    """In the first lines, where counts stand."""
    at = rng.randrange(min(len(lines), 8))
    fields = lines[at].split() or [""]
    fields[rng.randrange(len(fields))] = rng.choice(ODD)
    lines[at] = " ".join(fields)
    return lines


def odd_text(rng: random.Random, lines: list[str]) -> list[str]:
    at = rng.randrange(len(lines))
    place = rng.randrange(len(lines[at]) + 1)
    lines[at] = lines[at][:place] + rng.choice(ODD) + lines[at][place:]
    return lines


def short_line(rng: random.Random, lines: list[str]) -> list[str]:
    at = rng.randrange(len(lines))
    lines[at] = lines[at][: rng.randrange(len(lines[at]) + 1)]
    return lines


def other_exponent(rng: random.Random, lines: list[str]) -> list[str]:
    mark = rng.choice(["D", "e", "", " "])
    return [line.replace("E", mark) for line in lines]


def other_signs(rng: random.Random, lines: list[str]) -> list[str]:
    at = rng.randrange(len(lines))
    lines[at] = lines[at].replace("-", "+")
    return lines


def reverse(rng: random.Random, lines: list[str]) -> list[str]:
    return lines[::-1]


def carriage_returns(rng: random.Random, lines: list[str]) -> list[str]:
    return [f"{line}\r" for line in lines]


MUTATORS: list[Callable[[random.Random, list[str]], list[str]]] = [
    cut, drop, repeat, swap, odd_field, odd_head, odd_text, short_line, other_exponent, other_signs,
    reverse, carriage_returns,
]  # fmt: skip


def damaged(rng: random.Random, text: str) -> bytes:
    lines = text.split("\n")
    mutate = rng.choice(MUTATORS)
    for _ in range(rng.choice([1, 1, 1, 2, 5])):
        lines = mutate(rng, lines) or [""]
    encoding = rng.choice(["utf-8", "utf-8", "utf-8", "utf-16", "latin-1"])
    return "\n".join(lines).encode(encoding, "replace")


@pytest.fixture(scope="module")
def seeds(tmp_path_factory) -> dict[str, list[str]]:
    """Good files to start from: FGONG, columns with and without Gamma1, an observed list."""
    folder = tmp_path_factory.mktemp("seeds")
    star = oscsolve.polytrope(3)
    oscsolve.write_model(star, folder / "star.fgong")
    inside = star.density > 0.0
    columns = [star.radius, star.mass, star.pressure, star.density, star.gamma1]
    rows = zip(*(column[inside].tolist() for column in columns), strict=True)
    names = "radius mass pressure density gamma1"
    table = "\n".join([names, *(" ".join(f"{value:.12e}" for value in row) for row in rows)])
    bare = "\n".join(" ".join(line.split()[:4]) for line in table.split("\n"))
    observed = "\n".join(
        ["# invented", "degree,order,nu,nu_error"]
        + [f"{k % 3},{k // 3},{1000 + 45.1 * k:.3f},0.1" for k in range(30)]
    )
    fgong = (folder / "star.fgong").read_text()
    return {"model": [fgong, table, bare], "observed": [observed]}


def test_damaged_files_are_read_or_refused_in_one_line(seeds, tmp_path):
    rng, file = random.Random(20261201), tmp_path / "damaged"
    read = refused = 0
    for number in range(MUTATIONS):
        kind = rng.choice(["model", "model", "model", "observed"])
        file.write_bytes(damaged(rng, rng.choice(seeds[kind])))
        try:
            if kind == "observed":
                oscsolve.read_observed(file)
            else:
                oscsolve.inspect_model(oscsolve.read_model(file))
            read += 1
        except OscsolveError as error:
            refused += 1
            message = str(error)
            assert "\n" not in message and len(message) < LONGEST, (number, message)
    assert read > 0.05 * MUTATIONS and refused > 0.3 * MUTATIONS
