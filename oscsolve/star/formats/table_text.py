"""Finding a labelled table of numbers, its names and its run constants in a text file."""

from __future__ import annotations

import math
import re
from collections import Counter
from dataclasses import dataclass

from oscsolve.errors import InputError
from oscsolve.star.formats.column_names import CONSTANTS, UNIT_WORDS, match_names
from oscsolve.star.formats.numbers import is_number, parse_number

_COMMENT = "#!%"
#: Rows of numbers in a line, of one length, that make a table rather than a block of constants.
_RUN = 3
_MIN_COLUMNS = 4
#: Words that one name may have.
_NAME_WORDS = 6
# "name....... value unit", "name = value", "name: value"
_PAIR = re.compile(
    r"^([A-Za-z][\w .\-/]*?)\s*(?:\.{2,}|=|:)\s*([+-]?\d*\.?\d+(?:[EeDd][+-]?\d+)?)\s*([A-Za-z/]*)"
)


@dataclass(frozen=True)
class TableText:
    """Where the table is.

    Attributes
    ----------
    names : one per column
    first : index of the first row among the lines
    constants : quantity to (value, kind of unit or ""), see `CONSTANTS`
    """

    names: list[str]
    first: int
    constants: dict[str, tuple[float, str]]


def split_row(line: str) -> list[str]:
    """The fields of a row; commas and blanks separate."""
    return line.replace(",", " ").split()


def find_table(lines: list[str], where: str) -> TableText | None:
    """The table in these lines, or None if there is no run of rows with a line of names above.

    Raises
    ------
    InputError
        The names cannot be matched to the columns.
    """
    first = _first_row(lines)
    if first is None:
        return None
    header = _header_line(lines, first)
    if header is None:
        return None
    rows = [lines[first + k] for k in range(_RUN)]
    names = split_names(lines[header], rows)
    if names is None:
        raise InputError(
            f"{where}, line {header + 1}: these names cannot be matched to the "
            f"{len(split_row(rows[0]))} columns below; write one name without blanks per column"
        )
    return TableText(names, first, _constants(lines[:header]))


def _first_row(lines: list[str]) -> int | None:
    run, count = 0, 0
    for k, line in enumerate(lines):
        fields = split_row(line)
        numeric = len(fields) >= _MIN_COLUMNS and all(is_number(field) for field in fields)
        # Numbers of the columns are no row of data: a table holds more than whole numbers.
        numeric = numeric and not all(field.isdigit() for field in fields)
        if not numeric:
            run = 0
        elif run and len(fields) == count:
            run += 1
        else:
            run, count = 1, len(fields)
        if run == _RUN:
            return k - _RUN + 1
    return None


def _header_line(lines: list[str], first: int) -> int | None:
    for k in range(first - 1, -1, -1):
        words = lines[k].strip().strip(_COMMENT).split()
        if any(re.search(r"[A-Za-z]", word) and not is_number(word) for word in words):
            return k
    return None


def split_names(line: str, rows: list[str]) -> list[str] | None:
    """The names in a header line, one for each column of the rows below it, or None.

    Tried in turn: commas, brackets, blanks, double blanks, the alignment of the names with the
    left or the right ends of the columns, and a steady distance between names that the numbers
    do not share (the last two for names with blanks in them).
    """
    count = len(split_row(rows[0]))
    # The comment sign becomes a blank, so that the names keep their places over the columns.
    line = re.sub(rf"^(\s*)[{_COMMENT}]", r"\1 ", line).rstrip()
    for names in (
        line.split(",") if "," in line else [],
        re.findall(r"\[([^\]]*)\]", line),
        line.split(),
        re.split(r"\s{2,}", line.strip()),
        _aligned(line, rows, count),
        _pitched(line, count),
    ):
        if len(names) == count:
            return [name.strip() for name in names]
    return None


def _aligned(line: str, rows: list[str], count: int) -> list[str]:
    """Names from their places over the columns; empty if they do not lie over them.

    Words are dealt to the columns in order so that the names begin (or end) as near as possible
    to where the numbers do; a double blank always parts two names.
    """
    words = [(f.start(), f.end(), f[0]) for f in re.finditer(r"\S+", line)]
    spans = [[(f.start(), f.end()) for f in re.finditer(r"[^\s,]+", row)] for row in rows]
    if len(words) < count:
        return []
    # A minus sign moves the start of a field by one.
    starts = [max(row[k][0] for row in spans) for k in range(count)]
    ends = [max(row[k][1] for row in spans) for k in range(count)]
    must = [k == 0 or words[k][0] - words[k - 1][1] > 1 for k in range(len(words))]
    firsts_left = _deal([word[0] for word in words], starts, must)
    # For right-aligned names the same is done from the end of the line.
    backward = [k == 0 or words[-k][0] - words[-k - 1][1] > 1 for k in range(len(words))]
    lasts_right = _deal(
        [-word[1] for word in reversed(words)], [-end for end in reversed(ends)], backward
    )
    cost, firsts = firsts_left
    if lasts_right[0] < cost:
        cost = lasts_right[0]
        lasts = [len(words) - 1 - k for k in reversed(lasts_right[1])]
        firsts = [0, *(last + 1 for last in lasts[:-1])]
    # Two characters a name: more, and the names were laid out apart from the numbers.
    if not cost <= 2.0 * count:
        return []
    return _join(words, firsts)


def _pitched(line: str, count: int) -> list[str]:
    """Names that begin a steady number of characters apart, whatever the numbers below do.

    The distance is the commonest one between words behind a double blank; the words are dealt
    to the columns so that the distances between names differ least from it.
    """
    words = [(f.start(), f.end(), f[0]) for f in re.finditer(r"\S+", line)]
    parted = [k == 0 or words[k][0] - words[k - 1][1] > 1 for k in range(len(words))]
    begins = [word[0] for word, new in zip(words, parted, strict=True) if new]
    if len(words) < count or len(begins) < 3 or len(begins) > count:
        return []
    pitch = Counter(b - a for a, b in zip(begins, begins[1:], strict=False)).most_common(1)[0][0]
    # cost[c][k]: least cost of a deal in which name c begins with word k.
    cost = [{0: (0.0, -1)}]
    for _ in range(1, count):
        row: dict[int, tuple[float, int]] = {}
        for before, (paid, _) in cost[-1].items():
            for k in range(before + 1, min(before + 1 + _NAME_WORDS, len(words))):
                total = paid + abs(words[k][0] - words[before][0] - pitch)
                if total < row.get(k, (math.inf, -1))[0]:
                    row[k] = (total, before)
                if parted[k]:
                    break
        cost.append(row)
    ends = [k for k in cost[-1] if not any(parted[k + 1 :])]
    if not ends:
        return []
    firsts = [min(ends, key=lambda k: cost[-1][k][0])]
    for row in reversed(cost[1:]):
        firsts.append(row[firsts[-1]][1])
    return _join(words, firsts[::-1])


def _join(words: list[tuple[int, int, str]], firsts: list[int]) -> list[str]:
    stops = [*firsts[1:], len(words)]
    return [" ".join(word[2] for word in words[a:b]) for a, b in zip(firsts, stops, strict=True)]


def _deal(places: list[int], targets: list[int], must: list[bool]) -> tuple[float, list[int]]:
    """The first word of each column with the least sum of distances, by dynamic programming.

    Parameters
    ----------
    places : where each word begins
    targets : where each column begins
    must : True for a word that cannot continue the name before it

    Returns
    -------
    cost, firsts : sum of the distances (infinite if impossible) and one index per column
    """
    size, count = len(places), len(targets)
    # best[k]: least cost with word k first of the present column; back[c][k]: word before it.
    best = [abs(places[0] - targets[0]) if k == 0 else math.inf for k in range(size)]
    back: list[list[int]] = []
    for target in targets[1:]:
        new, came = [math.inf] * size, [0] * size
        low, at = math.inf, 0
        for k in range(1, size):
            # The name before may begin at any word since the last forced break.
            low, at = (best[k - 1], k - 1) if must[k - 1] else min((low, at), (best[k - 1], k - 1))
            new[k], came[k] = low + abs(places[k] - target), at
        best, back = new, [*back, came]
    # Words behind the last first word must all continue its name.
    last = max(k for k in range(size) if must[k])
    end = min(range(last, size), key=best.__getitem__)
    firsts = [end]
    for came in reversed(back):
        firsts.append(came[firsts[-1]])
    return best[end], firsts[::-1] if len(firsts) == count else []


def _constants(lines: list[str]) -> dict[str, tuple[float, str]]:
    names: list[str] = []
    values: list[tuple[float, str]] = []
    for k, line in enumerate(lines):
        text = line.strip().strip(_COMMENT).strip()
        pair = _PAIR.match(text)
        if pair:
            names.append(pair[1])
            values.append((parse_number(pair[2]), UNIT_WORDS.get(pair[3].lower(), "")))
            continue
        fields = _quoted(lines[k + 1]) if k + 1 < len(lines) else []
        labels = _quoted(text)
        if len(labels) != len(fields) or any(is_number(label) for label in labels):
            continue
        for label, field in zip(labels, fields, strict=True):
            if is_number(field):
                names.append(label)
                values.append((parse_number(field), ""))
    found = match_names(names, CONSTANTS)
    return {
        quantity: (values[at][0], values[at][1] or spelling.unit)
        for quantity, (at, spelling) in found.items()
    }


def _quoted(line: str) -> list[str]:
    return re.findall(r'"[^"]*"|\S+', line)
