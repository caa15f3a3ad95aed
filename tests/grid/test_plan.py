"""Which models a grid runs, in which order, and what is given with them."""

from __future__ import annotations

import os

import numpy as np
import pytest

import oscsolve
from oscsolve.errors import InputError
from oscsolve.grid.deal import Dealer
from oscsolve.grid.plan import GridModel, Planned, find_models, plan_models, read_parameters


@pytest.fixture
def tracks(tmp_path):
    """Two folders of three empty files, a hidden file among them."""
    for track in ("track-1", "track-2"):
        (tmp_path / track).mkdir()
        for number in (10, 9, 1):
            (tmp_path / track / f"m{number}.fgong").touch()
        (tmp_path / track / ".hidden").touch()
    return tmp_path


def names(paths, folder):
    return [os.path.relpath(path, folder) for path in paths]


def test_a_folder_means_its_files_in_natural_order(tracks):
    found = find_models([str(tracks / "track-1")])
    assert names(found, tracks) == ["track-1/m1.fgong", "track-1/m9.fgong", "track-1/m10.fgong"]


def test_a_pattern_keeps_tracks_together(tracks):
    found = find_models([str(tracks / "track-*" / "*.fgong")])
    assert [os.path.dirname(name) for name in names(found, tracks)] == ["track-1"] * 3 + [
        "track-2"
    ] * 3


def test_each_file_is_meant_once_in_the_order_of_the_arguments(tracks):
    found = find_models([str(tracks / "track-2" / "m9.fgong"), str(tracks / "track-2")])
    assert names(found, tracks) == ["track-2/m9.fgong", "track-2/m1.fgong", "track-2/m10.fgong"]


def test_a_list_names_files_folders_and_patterns_relative_to_itself(tracks, monkeypatch):
    (tracks / "list").write_text("# a comment\n\n  track-1/m9.fgong\ntrack-2\n@other\n")
    (tracks / "other").write_text("track-1/m?.fgong\nnowhere.fgong\n")
    monkeypatch.chdir(tracks / "track-1")
    found = find_models(["@../list"])
    assert names(found, tracks) == [
        "track-1/m9.fgong",
        "track-2/m1.fgong",
        "track-2/m9.fgong",
        "track-2/m10.fgong",
        "track-1/m1.fgong",
        "nowhere.fgong",  # a row that fails, and not the end of the whole run
    ]


def test_the_store_the_table_and_the_list_are_no_models(tracks):
    folder = tracks / "track-1"
    (folder / "list.txt").write_text("m1.fgong\n")
    (folder / "grid.h5").touch()
    found = find_models([str(folder), f"@{folder / 'list.txt'}"], skip=[folder / "grid.h5"])
    assert names(found, folder) == ["m1.fgong", "m9.fgong", "m10.fgong"]


@pytest.mark.parametrize(
    ("argument", "wanted"),
    [
        ("nothing.fgong", "nothing.fgong: no such file or folder"),
        ("empty", "this folder holds no files"),
        ("*.fgong", "no file fits this pattern"),
        ("@nothing", "there is no list"),
        ("@loop", "loop, line 1: .*this list names itself"),
        ("@blank", "no model file in @blank"),
        ("@binary", "this is no text in UTF-8"),
    ],
)
def test_arguments_that_name_nothing_are_refused(tmp_path, monkeypatch, argument, wanted):
    monkeypatch.chdir(tmp_path)
    (tmp_path / "empty").mkdir()
    (tmp_path / "loop").write_text("@loop\n")
    (tmp_path / "blank").write_text("# nothing\n")
    (tmp_path / "binary").write_bytes(b"\xff\xfe\x00\x01")
    with pytest.raises(InputError, match=wanted):
        find_models([argument])


def table(tmp_path, text):
    (tmp_path / "table.csv").write_text(text)
    files = [str(tmp_path / track / f"m{n}.fgong") for track in ("a", "b") for n in (1, 2)]
    files.append(str(tmp_path / "b" / "m3.fgong"))
    return read_parameters(tmp_path / "table.csv", files), files


def test_a_table_gives_numbers_whole_numbers_and_texts(tmp_path):
    found, files = table(
        tmp_path,
        "# made by hand\nmodel,mass,step,note\n"
        'a/m1.fgong,1.0,7,"hot, old"\nb/m1.fgong,,8,\nm3,1.5,9,x\nelsewhere,2,1,y\n',
    )
    assert found.of == {
        files[0]: {"mass": 1.0, "step": 7, "note": "hot, old"},
        files[2]: {"step": 8},
        files[4]: {"mass": 1.5, "step": 9, "note": "x"},
    }
    assert found.strangers == ("elsewhere",)


@pytest.mark.parametrize(
    ("text", "wanted"),
    [
        ("", "the table is empty"),
        ("file,mass\n", "line 1: expected headings, one of them 'model'"),
        ("model,mass,mass\n", "the heading 'mass' stands there twice"),
        ("model,status\n", "the name 'status' is taken by the store itself"),
        ("model,a/b\n", "'a/b' cannot name a parameter"),
        ("model,mass\na/m1.fgong\n", "line 2: expected 2 entries as in the headings; got 1"),
        ("model,mass\nm1,2\n", "line 2: 2 models are called 'm1'; give the path of one"),
        ("model,mass\nm3,2\n#\nb/m3.fgong,2\n", "line 4: the model .*m3.fgong has a line already"),
        ("model,mass\nx,2\n", "no line fits a model"),
    ],
)
def test_tables_that_cannot_be_used_are_refused(tmp_path, text, wanted):
    with pytest.raises(InputError, match=wanted):
        table(tmp_path, text)


def test_stars_are_recognised_by_content():
    one, same, other, turning = (
        next(plan_models([star])).key
        for star in (
            oscsolve.polytrope(1.5),
            oscsolve.polytrope(1.5),
            oscsolve.polytrope(1.6),
            oscsolve.polytrope(1.5).with_changes(gravitational_constant=6.67e-8),
        )
    )
    assert one == same
    assert len({one, other, turning}) == 3


def test_parameters_may_be_numpy_numbers():
    item = GridModel("x", parameters={"mass": np.float64(1.5), "step": np.int32(3)})
    assert dict(next(plan_models([item])).parameters) == {"mass": 1.5, "step": 3}


@pytest.mark.parametrize(
    ("item", "wanted"),
    [
        (3, "model 1: expected a file name, a StarModel or a GridModel; got int"),
        (GridModel("x", parameters={"a": [1]}), "model 1, parameter a: expected a number or a"),
        (GridModel("x", parameters={"a": True}), "expected a number or a text; got True"),
        (GridModel("x", parameters={"nu/x": 1}), "'nu/x' cannot name a parameter"),
        (GridModel("x", parameters={"message": 1}), "the name 'message' is taken"),
    ],
)
def test_what_is_no_model_is_refused(item, wanted):
    with pytest.raises(InputError, match=wanted):
        next(plan_models([item]))


def planned(*sources):
    return [Planned(source, source, source, None, "", {}) for source in sources]


def test_neighbours_of_a_track_go_to_one_worker_in_sequence():
    dealer = Dealer(planned("a/1", "a/2", "a/3", "b/1", "b/2"), block=2)
    hands = [
        (place, dealer.deal(place).source)
        for place in (
            0,
            1,
            0,
            2,
            1,
        )
    ]
    # a/1 and a/2 to worker 0; a/3 to worker 1, alone; b/1 to worker 2, and worker 1 helps it.
    assert hands == [(0, "a/1"), (1, "a/3"), (0, "a/2"), (2, "b/1"), (1, "b/2")]
    assert dealer.deal(0) is None


def test_every_model_is_dealt_once_whoever_asks():
    sources = [f"{track}/{number}" for track in "abc" for number in range(7)]
    chance = np.random.default_rng(1)
    dealer = Dealer(planned(*sources), block=3)
    dealt = [dealer.deal(int(chance.integers(4))).source for _ in sources]
    assert sorted(dealt) == sorted(sources)
    assert dealer.deal(0) is None


def test_the_plan_is_read_no_further_than_needed():
    read = []

    def endless():
        for number in range(10**9):
            read.append(number)
            yield from planned(f"a/{number}")

    dealer = Dealer(endless(), block=4)
    for place in (0, 1, 0, 1, 0):
        dealer.deal(place)
    assert len(read) <= 2 * 4 + 1
