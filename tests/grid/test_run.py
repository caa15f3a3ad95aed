"""What a run leaves in its store, whoever does the work and however often it is begun."""

from __future__ import annotations

import os
import shutil
from concurrent.futures import BrokenExecutor, Future, ProcessPoolExecutor

import h5py
import numpy as np
import pytest

import oscsolve
from oscsolve.errors import IncompleteError, InputError
from oscsolve.grid import run, work
from oscsolve.grid.plan import GridModel
from oscsolve.store.journal import journal_path
from oscsolve.store.lock import lock_path, only_writer


@pytest.fixture
def solve(kit, tmp_path):
    """Function that solves a grid in this process into ``grid.h5``."""

    def solve_here(models, **changes):
        with kit.Inline() as pool:
            return oscsolve.solve_grid(
                models, tmp_path / "grid.h5", **{**kit.ASKED, "executor": pool, **changes}
            )

    return solve_here


class StopAfter(Exception):
    """What ends a run in a test."""


@pytest.fixture
def stop_after(monkeypatch):
    """Function that makes the run end once so many rows are in the journal."""

    def arm(rows: int, error: BaseException) -> None:
        keep = run._Run._keep

        def keep_some(self, report):
            if self.solved == rows:
                raise error
            keep(self, report)

        monkeypatch.setattr(run._Run, "_keep", keep_some)

    return arm


def test_rows_hold_what_solve_modes_gives(kit, field, undisturbed):
    grid = oscsolve.load_grid(undisturbed)
    assert grid.finished
    assert list(grid.name) == [f"lantern-{number}" for number in range(1, kit.STARS + 1)]
    for file, row in zip(field, grid, strict=True):
        modes = oscsolve.solve_modes(oscsolve.read_model(file), **kit.ASKED)
        np.testing.assert_array_equal(row.nu, modes.nu)
        np.testing.assert_array_equal(row.inertia, modes.inertia)
        np.testing.assert_array_equal(row.census.counted, modes.census.counted)
        assert row.findings == modes.findings
        assert row.complete
        assert row.source_hash == modes.star.source_hash
        assert row.nu_dynamical == pytest.approx(modes.star.nu_dynamical, rel=1e-15)


def test_a_model_of_a_store_is_the_mode_list_of_its_file(kit, field, undisturbed):
    modes = oscsolve.load_modes(undisturbed, model="lantern-3")
    alone = oscsolve.solve_modes(oscsolve.read_model(field[2]), **kit.ASKED)
    np.testing.assert_array_equal(modes.nu, alone.nu)
    np.testing.assert_array_equal(modes.star.density, alone.star.density)
    assert dict(modes.options).items() <= dict(alone.options).items()
    assert {"degrees", "band_low_uHz", "band_chosen_by_program", "tolerance"} <= set(modes.options)


def test_own_workers_leave_the_same_store_whatever_their_number(kit, field, undisturbed, tmp_path):
    for workers in (1, 3):
        store = tmp_path / f"{workers}.h5"
        told = []
        summary = oscsolve.solve_grid(
            field, store, workers=workers, progress=told.append, **kit.ASKED
        )
        assert (summary.complete, summary.solved, summary.kept) == (kit.STARS, kit.STARS, 0)
        assert 0.0 < summary.solving < summary.working <= 1.0
        assert [item.done for item in told] == list(range(kit.STARS + 1))
        assert {item.workers for item in told} == {workers}
        kit.assert_same_store(store, undisturbed)
        assert kit.leftovers(store) == []


def test_a_process_pool_of_the_caller_does_the_same(kit, field, undisturbed, tmp_path):
    import multiprocessing

    with ProcessPoolExecutor(2, mp_context=multiprocessing.get_context("spawn")) as pool:
        oscsolve.solve_grid(field, tmp_path / "grid.h5", executor=pool, **kit.ASKED)
    kit.assert_same_store(tmp_path / "grid.h5", undisturbed)


def test_a_generator_of_stars_is_read_as_workers_become_free(solve, tmp_path):
    alive = []

    def stars():
        for number in range(40):
            alive.append(number - told[-1].done if told else number)
            yield oscsolve.polytrope(1.0 + 0.01 * number)

    told = []
    summary = solve(stars(), degrees=[0], progress=told.append)
    assert summary.complete == 40
    # Two in flight and a block of eight set aside.
    assert max(alive) <= 12
    assert told[0].total is None
    grid = oscsolve.load_grid(tmp_path / "grid.h5")
    assert grid.finished and grid.planned == 40
    assert set(grid.source) == {""} and len(set(grid.source_hash)) == 40


def test_parameters_and_names_come_with_the_models(solve, tmp_path):
    models = [
        GridModel(oscsolve.polytrope(1.5), "one", {"mass": 1, "note": "a"}),
        GridModel(oscsolve.polytrope(1.6), "two", {"mass": 1.5}),
        GridModel(oscsolve.polytrope(1.7), "three", {"step": 3}),
    ]
    solve(models, degrees=[0])
    grid = oscsolve.load_grid(tmp_path / "grid.h5")
    assert list(grid.name) == ["one", "two", "three"]
    np.testing.assert_array_equal(grid.parameters["mass"], [1.0, 1.5, np.nan])
    np.testing.assert_array_equal(grid.parameters["step"], [np.nan, np.nan, 3.0])
    assert list(grid.parameters["note"]) == ["a", "", ""]
    assert dict(grid.row("two").parameters) == {"mass": 1.5}


def test_new_parameters_reach_rows_that_are_there(solve, tmp_path):
    star = oscsolve.polytrope(1.5)
    solve([GridModel(star, "one", {"mass": 1})], degrees=[0])
    summary = solve([GridModel(star, "one", {"mass": 2, "age": 0.5})], degrees=[0])
    assert (summary.solved, summary.kept) == (0, 1)
    grid = oscsolve.load_grid(tmp_path / "grid.h5")
    assert dict(grid.row(0).parameters) == {"mass": 2, "age": 0.5}


def test_a_model_that_fails_is_a_row_with_its_message(solve, field, tmp_path):
    (tmp_path / "bad.fgong").write_text("no model\n")
    models = [field[0], tmp_path / "bad.fgong", tmp_path / "none.fgong", field[1]]
    summary = solve(models)
    assert (summary.complete, summary.failed, summary.all_complete) == (2, 2, False)
    assert len(summary.failures) == 2
    grid = oscsolve.load_grid(tmp_path / "grid.h5")
    assert list(grid.status) == ["complete", "failed", "failed", "complete"]
    assert "in no known format" in grid.message[1]
    assert "no such file" in grid.message[2]
    assert np.isnan(grid.total_mass[1]) and grid.mode_count[1] == 0
    assert np.all(grid.counted[1] == -1)


def test_a_star_that_cannot_be_solved_keeps_its_scales(solve, tmp_path):
    star = oscsolve.polytrope(1.5)
    summary = solve([star], surface="isothermal")
    assert summary.failed == 1
    row = oscsolve.load_grid(tmp_path / "grid.h5").row(0)
    assert "this star has an edge" in row.message
    assert row.total_mass == star.total_mass and row.points == star.radius.size


def test_an_unexpected_error_is_a_failed_row_too(solve, monkeypatch, tmp_path):
    def fail(*_, **__):
        raise ZeroDivisionError("a bug")

    monkeypatch.setattr(work, "solve_star", fail)
    assert solve([oscsolve.polytrope(1.5)]).failures == (
        "polytrope of index 3/2: unexpected ZeroDivisionError: a bug",
    )


def test_failed_models_and_changed_files_are_solved_when_a_run_goes_on(solve, kit, field, tmp_path):
    files = [tmp_path / f"{number}.fgong" for number in range(3)]
    shutil.copy(field[0], files[0])
    shutil.copy(field[1], files[1])
    solve(files)
    shutil.copy(field[2], files[2])
    shutil.copy(field[3], files[1])
    summary = solve(files)
    assert (summary.complete, summary.solved, summary.kept) == (3, 2, 1)
    assert summary.notes == ("1 model file(s) had changed and were solved again",)
    grid = oscsolve.load_grid(tmp_path / "grid.h5")
    fourth = oscsolve.solve_modes(oscsolve.read_model(field[3]), **kit.ASKED)
    np.testing.assert_array_equal(grid.row(1).nu, fourth.nu)
    # A new date alone changes nothing.
    os.utime(files[0])
    assert solve(files).solved == 0


def test_modes_of_a_file_that_is_gone_are_kept(solve, field, tmp_path):
    file = tmp_path / "a.fgong"
    shutil.copy(field[0], file)
    solve([file])
    file.unlink()
    assert solve([file]).kept == 1


def test_models_that_come_twice_are_solved_once(solve, field):
    summary = solve([field[0], field[1], field[0]])
    assert (summary.complete, summary.solved) == (2, 2)
    assert summary.notes == ("1 model(s) came twice and were solved once",)


def test_a_store_grows_and_keeps_rows_that_are_not_asked_for(solve, field, tmp_path):
    solve(field[2:4])
    summary = solve(field[:3])
    assert (summary.solved, summary.kept) == (2, 1)
    assert summary.notes == (
        "1 row(s) of models that were not asked for this time stand at the end",
    )
    grid = oscsolve.load_grid(tmp_path / "grid.h5")
    assert list(grid.name) == ["lantern-1", "lantern-2", "lantern-3", "lantern-4"]
    assert grid.finished


def test_a_finished_run_begun_again_changes_nothing(kit, field, undisturbed, tmp_path):
    store = tmp_path / "grid.h5"
    shutil.copy(undisturbed, store)

    class Nobody:
        def submit(self, *_):
            raise AssertionError("there is nothing to do")

    summary = oscsolve.solve_grid(field, store, executor=Nobody(), **kit.ASKED)
    assert (summary.kept, summary.solved) == (kit.STARS, 0)
    kit.assert_same_store(store, undisturbed)
    assert kit.leftovers(store) == []


@pytest.mark.parametrize("rows", [0, 1, 7])
def test_a_run_that_was_broken_off_ends_as_if_it_had_not_been(
    kit, field, undisturbed, tmp_path, solve, stop_after, monkeypatch, rows
):
    store = tmp_path / "grid.h5"
    with monkeypatch.context() as patch:
        keep = run._Run._keep

        def keep_some(self, report):
            if self.solved == rows:
                raise StopAfter
            keep(self, report)

        patch.setattr(run._Run, "_keep", keep_some)
        with pytest.raises(StopAfter):
            solve(field)
    # What is there is valid, and says that it is not all.
    assert not oscsolve.load_grid(store).finished
    assert journal_path(store).exists() and not lock_path(store).exists()
    summary = solve(field)
    assert (summary.kept, summary.solved) == (rows, kit.STARS - rows)
    kit.assert_same_store(store, undisturbed)
    assert kit.leftovers(store) == []


def test_an_interrupt_shows_the_rows_so_far(field, tmp_path, solve, stop_after):
    stop_after(5, KeyboardInterrupt())
    with pytest.raises(KeyboardInterrupt):
        solve(field)
    grid = oscsolve.load_grid(tmp_path / "grid.h5")
    assert len(grid) == 5 and not grid.finished and grid.planned == len(field)
    assert len(list(grid)) == 5


def test_rows_appear_in_the_store_while_the_run_lasts(field, tmp_path, solve, monkeypatch):
    monkeypatch.setattr(run, "_FIRST_STORE", 0.0)
    monkeypatch.setattr(run, "_NEXT_STORE", 0.0)
    monkeypatch.setattr(run, "_STORE_SHARE", 0.0)
    seen = []

    def look(progress):
        grid = oscsolve.load_grid(tmp_path / "grid.h5")
        assert not grid.finished
        seen.append(len(list(grid)))

    solve(field, progress=look)
    assert seen == [0, *range(len(field))]


@pytest.mark.parametrize(
    ("changes", "wanted"),
    [
        ({"tolerance": 1e-6}, r"begun with tolerance 1e-08 \(now 1e-06\); give the same options"),
        ({"degrees": (0, 2)}, r"begun with degrees 0,1 \(now 0,2\)"),
        ({"band": (4, 30)}, r"begun with band_first 3.0 \(now 4.0\)"),
        ({"band": None}, r"band_first 3.0 \(now none\).* band_unit sigma2 \(now chosen\)"),
        ({"gravity": "cowling"}, r"begun with gravity full \(now cowling\)"),
        ({"gravitational_constant": 6.67e-8}, r"gravitational_constant none \(now 6.67e-08\)"),
        ({"eigenfunctions": True}, r"begun with eigenfunctions False \(now True\)"),
    ],
)
def test_other_options_are_refused_for_a_store_and_for_its_journal(
    solve, field, tmp_path, monkeypatch, stop_after, changes, wanted
):
    store = tmp_path / "grid.h5"
    solve(field[:1])
    before = store.read_bytes()
    with pytest.raises(InputError, match=wanted):
        solve(field[:1], **changes)
    assert store.read_bytes() == before
    with monkeypatch.context() as patch:
        patch.setattr(run._Run, "_finish", lambda *_: None)
        solve(field[:2])
    with pytest.raises(InputError, match=wanted):
        solve(field[:1], **changes)
    summary = solve(field[:1], overwrite=True, **changes)
    assert (summary.kept, summary.solved) == (0, 1)


def test_another_version_of_the_program_is_refused(solve, field, monkeypatch):
    solve(field[:1])
    monkeypatch.setattr(run, "__version__", "9.9.9")
    with pytest.raises(InputError, match=r"begun with oscsolve .*, this is 9\.9\.9"):
        solve(field[:1])


def test_a_file_that_is_no_store_is_not_replaced_unasked(solve, field, tmp_path):
    store = tmp_path / "grid.h5"
    store.write_text("a diary")
    with pytest.raises(InputError, match="not an HDF5 file; expected a grid store"):
        solve(field[:1])
    assert store.read_text() == "a diary"
    assert solve(field[:1], overwrite=True).complete == 1


@pytest.mark.parametrize(
    ("changes", "wanted"),
    [
        ({"degrees": [-1]}, "degrees must be from 0"),
        ({"band": (0, 30)}, "the band begins at 0 uHz; for l > 0"),
        ({"gravity": "none"}, "gravity must be one of"),
        ({"surface": "none"}, "surface must be one of"),
        ({"tolerance": 0.0}, "tolerance must be from"),
        ({"gravitational_constant": -1.0}, "gravitational_constant must be above zero; got -1"),
        ({"workers": 0}, "workers must be at least 1; got 0"),
    ],
)
def test_arguments_out_of_range_are_refused_before_anything_happens(
    solve, field, tmp_path, changes, wanted
):
    with pytest.raises(InputError, match=wanted):
        solve(field, **changes)
    assert list(tmp_path.iterdir()) == []


def test_a_folder_that_is_missing_is_one_line(kit, field, tmp_path):
    with pytest.raises(InputError, match="cannot be written .*check that the folder exists"):
        oscsolve.solve_grid(field, tmp_path / "none" / "grid.h5", **kit.ASKED)
    with pytest.raises(InputError, match="this is a folder; give the name of a file"):
        oscsolve.solve_grid(field, tmp_path, **kit.ASKED)


def test_two_runs_on_one_store_are_one_too_many(solve, field, tmp_path):
    with (
        only_writer(tmp_path / "grid.h5"),
        pytest.raises(
            InputError, match=rf"another run is writing this store \(process {os.getpid()} on .*\)"
        ),
    ):
        solve(field[:1])
    # A lock file that a killed run left behind stops nobody.
    lock_path(tmp_path / "grid.h5").write_text("process 1 on nowhere")
    assert solve(field[:1]).complete == 1


def test_eigenfunctions_are_kept_on_request(solve, kit, field, tmp_path):
    solve(field[:2])
    with h5py.File(tmp_path / "grid.h5") as file:
        assert "eigenfunctions" not in file
    solve(field[:2], eigenfunctions=True, overwrite=True)
    modes = oscsolve.load_modes(tmp_path / "grid.h5", model=1)
    alone = oscsolve.solve_modes(oscsolve.read_model(field[1]), **kit.ASKED)
    np.testing.assert_array_equal(modes.eigenfunction(2).xi_r, alone.eigenfunction(2).xi_r)
    # They survive a run that goes on from the finished store.
    solve(field[:3], eigenfunctions=True)
    modes = oscsolve.load_modes(tmp_path / "grid.h5", model=1)
    np.testing.assert_array_equal(modes.eigenfunction(2).xi_r, alone.eigenfunction(2).xi_r)


def test_a_warm_start_finds_the_same_modes(solve, field, undisturbed, tmp_path, monkeypatch):
    """Each model but the first is searched from the one before; census and labels are the same."""
    given = []
    plain = work.solve_modes

    def watched(star, *args, **keywords):
        if "similar" in keywords:
            given.append(keywords["similar"])
        return plain(star, *args, **keywords)

    monkeypatch.setattr(work, "solve_modes", watched)
    assert solve(field, warm_start=True).complete == len(field)
    assert given[0] is None and all(modes is not None for modes in given[1:])
    cold, warm = oscsolve.load_grid(undisturbed), oscsolve.load_grid(tmp_path / "grid.h5")
    for one, other in zip(cold, warm, strict=True):
        np.testing.assert_array_equal(one.order, other.order)
        np.testing.assert_array_equal(one.census.counted, other.census.counted)
        assert np.all(np.abs(one.nu - other.nu) <= one.nu_error)


def test_a_second_opinion_is_kept(solve, field, tmp_path):
    assert solve(field[:1], verify=True).complete == 1
    row = oscsolve.load_grid(tmp_path / "grid.h5").row(0)
    np.testing.assert_allclose(row.nu_second, row.nu, rtol=1e-7)  # ten times the tolerance
    assert oscsolve.load_modes(tmp_path / "grid.h5", model=0).confirmed.all()


def test_an_executor_that_breaks_ends_the_run_and_keeps_the_rows(kit, field, tmp_path):
    class Fragile(kit.Inline):
        submitted = 0

        def submit(self, call, *arguments):
            self.submitted += 1
            if self.submitted <= 5:
                return super().submit(call, *arguments)
            future = Future()
            future.set_exception(BrokenExecutor("gone"))
            return future

    store = tmp_path / "grid.h5"
    with Fragile() as pool, pytest.raises(IncompleteError, match="the executor gave up"):
        oscsolve.solve_grid(field, store, executor=pool, **kit.ASKED)
    with kit.Inline() as pool:
        summary = oscsolve.solve_grid(field, store, executor=pool, **kit.ASKED)
    # The first job is the introduction.
    assert 1 <= summary.kept <= 4 and summary.complete == len(field)


def test_an_executor_that_was_shut_down_is_one_line(kit, field, tmp_path):
    with kit.Inline() as pool:
        pass
    with pytest.raises(IncompleteError, match="cannot schedule new futures after shutdown"):
        oscsolve.solve_grid(field, tmp_path / "grid.h5", executor=pool, **kit.ASKED)


def test_workers_of_another_version_are_refused(kit, field, tmp_path, monkeypatch):
    monkeypatch.setattr(work, "__version__", "0.0.1")
    with kit.Inline() as pool, pytest.raises(InputError, match=r"the workers run oscsolve 0\.0\.1"):
        oscsolve.solve_grid(field, tmp_path / "grid.h5", executor=pool, **kit.ASKED)
