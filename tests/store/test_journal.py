"""A journal loses nothing that was added: not to a kill, a full disk, nor damage elsewhere."""

from __future__ import annotations

import os
import random
import signal
import subprocess
import sys
from dataclasses import replace

import numpy as np
import pytest

import oscsolve
from oscsolve.errors import InputError
from oscsolve.store import records
from oscsolve.store.grid_write import GridHeader
from oscsolve.store.journal import Journal, journal_path, open_journal
from oscsolve.store.records import pack_record, scan, unpack_record
from oscsolve.store.rows import GridRow, row_of_modes

HEADER = GridHeader({"gravity": "full", "band_first": None}, (0, 1), "0.1.0")


@pytest.fixture
def rows(handmade_modes):
    """Ten invented rows: two failed, one with eigenfunctions."""
    modes = handmade_modes()
    plain = replace(modes, eigenfunctions=None)
    made = []
    for number in range(10):
        labels = {"name": f"lantern-{number}", "source": f"/f/{number}", "source_hash": "x"}
        if number % 5 == 4:
            made.append(GridRow(**labels, status="failed", message="\u03bc is no number"))
        else:
            made.append(
                row_of_modes(
                    modes if number == 2 else plain, **labels, parameters={"mass": 1.0 * number}
                )
            )
    return made


@pytest.fixture
def store(tmp_path):
    return tmp_path / "grid.h5"


def fill(store, rows):
    with open_journal(store, HEADER, overwrite=False) as journal:
        for number, row in enumerate(rows):
            journal.add(row.source, row, stamp=(1, number), seconds=0.1)


def assert_rows(journal: Journal, rows) -> None:
    assert list(journal.entries) == [row.source for row in rows]
    for row in rows:
        back = journal.row(row.source)
        assert (back.name, back.status, back.message) == (row.name, row.status, row.message)
        np.testing.assert_array_equal(back.nu, row.nu)
        np.testing.assert_array_equal(back.kind, row.kind)
        np.testing.assert_array_equal(back.census.counted, row.census.counted)
        assert back.findings == row.findings and back.parameters == row.parameters
        assert (back.eigenfunctions is None) == (row.eigenfunctions is None)


def test_rows_come_back(store, rows):
    fill(store, rows)
    with open_journal(store, HEADER, overwrite=False) as journal:
        assert_rows(journal, rows)
        assert journal.notes == []
        assert journal.entries["/f/3"].stamp == (1, 3)


def test_the_last_row_of_a_key_counts(store, rows):
    fill(store, [rows[0], replace_name(rows[1], rows[0].source)])
    with open_journal(store, HEADER, overwrite=False) as journal:
        assert journal.row("/f/0").name == "lantern-1"
        assert len(journal.entries) == 1


def replace_name(row, source):
    return GridRow(
        **{n: getattr(row, n) for n in GridRow.__dataclass_fields__} | {"source": source}
    )


def test_wherever_a_writer_was_killed_the_rows_before_are_there(store, rows):
    """The journal is cut around the ends of its last records, and anywhere between."""
    fill(store, rows)
    path = journal_path(store)
    data = path.read_bytes()
    with path.open("rb") as stream:
        ends = [after for _, after, _ in scan(stream)]
    chance = random.Random(3)
    cuts = {cut + step for cut in ends[-4:] for step in (-1, 0, 1, 8, 24)}
    cuts |= {chance.randrange(ends[1], len(data)) for _ in range(30)}
    for cut in sorted(cut for cut in cuts if cut <= len(data)):
        path.write_bytes(data[:cut])
        whole = sum(end <= cut for end in ends) - 1
        with open_journal(store, HEADER, overwrite=False) as journal:
            assert_rows(journal, rows[:whole])
            assert bool(journal.notes) == (cut not in ends)
            # The next run goes on behind the last whole row.
            journal.add(rows[9].source, rows[9])
        with open_journal(store, HEADER, overwrite=False) as journal:
            assert_rows(journal, [*rows[:whole], *rows[9:][: whole < 10]])
            assert journal.notes == []


def test_damage_in_the_middle_costs_the_row_it_hits(store, rows):
    fill(store, rows)
    path = journal_path(store)
    data = path.read_bytes()
    with path.open("rb") as stream:
        found = [(begin, after) for begin, after, _ in scan(stream)][1:]
    chance = random.Random(5)
    for number, (begin, after) in enumerate(found[:-1]):
        for at in (begin, begin + 9, begin + 18, chance.randrange(begin + 24, after), after - 1):
            damaged = bytearray(data)
            damaged[at] ^= 0x55
            path.write_bytes(damaged)
            with open_journal(store, HEADER, overwrite=False) as journal:
                assert_rows(journal, [row for place, row in enumerate(rows) if place != number])
                assert "1 damaged place(s)" in journal.notes[0]


def test_a_mark_across_the_border_of_two_pieces_is_found(tmp_path, monkeypatch):
    monkeypatch.setattr(records, "_STRIDE", 16)
    record = pack_record({"a": 1}, {"x": np.arange(3.0)})
    for junk in range(40):
        (tmp_path / "j").write_bytes(b"\x00" * junk + record)
        with (tmp_path / "j").open("rb") as stream:
            ((begin, after, content),) = scan(stream)
        assert (begin, after) == (junk, junk + len(record))
        entry, arrays = unpack_record(content)
        assert entry == {"a": 1}
        np.testing.assert_array_equal(arrays["x"], [0.0, 1.0, 2.0])


@pytest.mark.parametrize("content", [b"", b"a diary\n", b"\x00" * 1000])
def test_a_file_that_is_no_journal_is_left_alone(store, content):
    journal_path(store).write_bytes(content)
    with pytest.raises(InputError, match="this is no journal of oscsolve, or its beginning is"):
        open_journal(store, HEADER, overwrite=False)
    assert journal_path(store).read_bytes() == content


def test_a_damaged_beginning_is_refused_and_not_taken_for_other_options(store, rows):
    fill(store, rows)
    data = bytearray(journal_path(store).read_bytes())
    data[30] ^= 1
    journal_path(store).write_bytes(data)
    with pytest.raises(InputError, match="the beginning of this journal is damaged"):
        open_journal(store, HEADER, overwrite=False)
    assert journal_path(store).read_bytes() == data


def test_a_journal_of_another_layout_is_refused(store):
    head = {"kind": "run", "layout": 99, "program_version": "9.9", "options": {}}
    journal_path(store).write_bytes(pack_record(head, {}))
    with pytest.raises(InputError, match=r"written by another version of oscsolve \(9\.9\)"):
        open_journal(store, HEADER, overwrite=False)


def test_a_store_is_made_in_the_order_asked_for(store, rows):
    order = [row.source for row in reversed(rows)]
    with open_journal(store, HEADER, overwrite=False) as journal:
        for row in rows[:4]:
            journal.add(row.source, row)
        journal.publish(order, 10, eigenfunctions=False)
        grid = oscsolve.load_grid(store)
        assert not grid.finished and grid.planned == 10
        assert [row.name for row in grid] == [f"lantern-{n}" for n in (3, 2, 1, 0)]
        assert all(row.eigenfunctions is None for row in grid)
        for row in rows[4:]:
            journal.add(row.source, row)
        journal.publish(order[:6], 6, eigenfunctions=True)
        journal.remove()
    grid = oscsolve.load_grid(store)
    # Those not asked for stand at the end, in the order in which they came.
    assert [int(row.name[-1]) for row in grid] == [9, 8, 7, 6, 5, 4, 0, 1, 2, 3]
    assert grid.finished
    assert grid.row("lantern-2").eigenfunctions is not None
    assert not journal_path(store).exists()


def test_a_finished_store_becomes_a_journal_again(store, rows):
    fill(store, rows)
    with open_journal(store, HEADER, overwrite=False) as journal:
        journal.publish([row.source for row in rows], 10, eigenfunctions=True)
        journal.remove()
    with open_journal(store, HEADER, overwrite=False) as journal:
        assert_rows(journal, rows)


def test_whole_numbers_that_some_rows_lack_become_numbers_with_nan(store, rows):
    with open_journal(store, HEADER, overwrite=False) as journal:
        for number, parameters in enumerate([{"step": 1, "id": 7}, {"id": 8}]):
            values = {name: getattr(rows[0], name) for name in GridRow.__dataclass_fields__}
            journal.add(str(number), GridRow(**values | {"parameters": parameters}))
        journal.publish(["0", "1"], 2, eigenfunctions=False)
    grid = oscsolve.load_grid(store)
    np.testing.assert_array_equal(grid.parameters["step"], [1.0, np.nan])
    assert grid.parameters["id"].dtype.kind == "i"


def test_a_full_disk_keeps_the_rows_before(store, rows, monkeypatch):
    with open_journal(store, HEADER, overwrite=False) as journal:
        journal.add(rows[0].source, rows[0])
        write, calls = os.write, []

        def half(handle, data):
            if calls:
                raise OSError(28, "No space left on device")
            calls.append(1)
            return write(handle, data[: len(data) // 2])

        monkeypatch.setattr(os, "write", half)
        with pytest.raises(InputError, match=r"No space left.*the 1 rows before are safe"):
            journal.add(rows[1].source, rows[1])
        monkeypatch.undo()
        journal.add(rows[2].source, rows[2])
    with open_journal(store, HEADER, overwrite=False) as journal:
        assert_rows(journal, [rows[0], rows[2]])
        assert journal.notes == []


@pytest.mark.skipif(not hasattr(signal, "SIGKILL"), reason="the system has no SIGKILL")
def test_a_writer_killed_within_the_store_leaves_the_old_one_and_no_litter(store, rows):
    fill(store, rows)
    with open_journal(store, HEADER, overwrite=False) as journal:
        journal.publish(list(journal.entries)[:3], None, eigenfunctions=False)
    before = store.read_bytes()
    script = (
        "import os, pathlib, signal, sys\n"
        "from oscsolve.store import grid_write\n"
        "from oscsolve.store.journal import *\n"
        "store = pathlib.Path(sys.argv[1])\n"
        "header = GridHeader({'gravity': 'full', 'band_first': None}, (0, 1), '0.1.0')\n"
        "grid_write._Tables.check_full = lambda self: os.kill(os.getpid(), signal.SIGKILL)\n"
        "with open_journal(store, header, overwrite=False) as journal:\n"
        "    journal.publish(list(journal.entries), 10, eigenfunctions=True)\n"
    )
    ended = subprocess.run([sys.executable, "-c", script, os.fspath(store)], check=False)
    assert ended.returncode == -signal.SIGKILL
    assert store.read_bytes() == before
    assert len(list(store.parent.iterdir())) == 3
    (store.parent / ".grid.h5.other.h5.abcdefgh.tmp").touch()
    with open_journal(store, HEADER, overwrite=False) as journal:
        assert_rows(journal, rows)
    # What belongs to another store is left alone.
    assert sorted(entry.name for entry in store.parent.iterdir()) == [
        ".grid.h5.other.h5.abcdefgh.tmp",
        "grid.h5",
        "grid.h5.journal",
    ]


@pytest.mark.skipif(not os.path.exists("/proc"), reason="needs a system with file size limits")
def test_a_store_that_does_not_fit_leaves_the_old_one_and_the_journal(store, rows):
    """A real limit of the system on the size of files, which fails in the depths of HDF5."""
    fill(store, rows)
    with open_journal(store, HEADER, overwrite=False) as journal:
        journal.publish(list(journal.entries)[:3], None, eigenfunctions=False)
    before = store.read_bytes()
    script = (
        "import resource, sys, pathlib, oscsolve\n"
        "from oscsolve.store.journal import *\n"
        "store = pathlib.Path(sys.argv[1])\n"
        "header = GridHeader({'gravity': 'full', 'band_first': None}, (0, 1), '0.1.0')\n"
        "with open_journal(store, header, overwrite=False) as journal:\n"
        "    resource.setrlimit(resource.RLIMIT_FSIZE, (int(sys.argv[2]),) * 2)\n"
        "    try:\n"
        "        journal.publish(list(journal.entries), 10, eigenfunctions=True)\n"
        "    except oscsolve.InputError as error:\n"
        "        print(error)\n"
    )
    for limit in (1000, 20_000, 100_000):
        ended = subprocess.run(
            [sys.executable, "-c", script, os.fspath(store), str(limit)],
            capture_output=True,
            text=True,
            check=False,
        )
        assert ended.returncode == 0, ended.stderr
        assert "grid.h5: cannot be written" in ended.stdout
        assert len(ended.stdout.splitlines()) == 1
        assert store.read_bytes() == before
        assert sorted(entry.name for entry in store.parent.iterdir()) == [
            "grid.h5",
            "grid.h5.journal",
        ]
    with open_journal(store, HEADER, overwrite=False) as journal:
        assert_rows(journal, rows)
