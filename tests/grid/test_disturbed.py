"""Runs in processes of their own, killed, interrupted and starved; nothing finished is lost."""

from __future__ import annotations

import os
import shutil
import signal
import subprocess
import sys
from pathlib import Path

import pytest

import oscsolve
from oscsolve.store.journal import journal_path
from oscsolve.store.lock import lock_path
from oscsolve.store.records import scan

pytestmark = pytest.mark.skipif(
    not Path("/proc").exists(), reason="looks at processes as this system shows them"
)

#: What `Odd` models and `ASKED` of the fixtures are on the command line.
OPTIONS = ("--degrees", "0-1", "--band", "3:30sigma2", "--workers", "2")


def rows_on_disk(store: Path) -> int:
    """Whole rows in the journal of a store."""
    path = journal_path(store)
    if not path.exists():
        return 0
    with path.open("rb") as stream:
        return sum(1 for _ in scan(stream)) - 1


def members(group: int) -> list[int]:
    """Living processes of a process group."""
    found = []
    for entry in Path("/proc").iterdir():
        if entry.name.isdigit():
            try:
                state, _, leader = (entry / "stat").read_text().rpartition(")")[2].split()[:3]
            except OSError:
                continue
            if int(leader) == group and state != "Z":
                found.append(int(entry.name))
    return found


@pytest.mark.parametrize("rows", [1, 6])
def test_after_a_kill_of_everything_the_same_command_goes_on(
    kit, field, undisturbed, tmp_path, rows
):
    store = tmp_path / "grid.h5"
    run = kit.start_grid(*field, "--store", store, *OPTIONS)
    kit.wait_until(lambda: rows_on_disk(store) >= rows)
    os.kill(run.pid, signal.SIGKILL)
    run.communicate()
    # Workers leave with the one who started them.
    kit.wait_until(lambda: not members(run.pid))
    before = rows_on_disk(store)
    assert rows <= before < kit.STARS
    assert not oscsolve.load_grid(store).finished
    with kit.Inline() as pool:
        summary = oscsolve.solve_grid(field, store, executor=pool, **kit.ASKED)
    assert (summary.kept, summary.solved) == (before, kit.STARS - before)
    kit.assert_same_store(store, undisturbed)
    assert kit.leftovers(store) == []


def test_an_interrupt_is_one_line_and_the_same_command_goes_on(kit, field, undisturbed, tmp_path):
    store = tmp_path / "grid.h5"
    run = kit.start_grid(*field, "--store", store, *OPTIONS)
    kit.wait_until(lambda: rows_on_disk(store) >= 2)
    # As a terminal does: to every process of the group.
    os.killpg(run.pid, signal.SIGINT)
    _, err = run.communicate(timeout=30)
    assert run.returncode == 130
    (line,) = [line for line in err.splitlines() if "models," not in line]
    rows = rows_on_disk(store)
    assert line == (
        f"oscsolve: interrupted: {rows} of {kit.STARS} models are in {store}; the same command "
        "goes on"
    )
    grid = oscsolve.load_grid(store)
    assert len(grid) == rows and not grid.finished
    assert not members(run.pid) and not lock_path(store).exists()
    ended = kit.start_grid(*field, "--store", store, *OPTIONS)
    out, err = ended.communicate(timeout=60)
    assert ended.returncode == 0, err
    assert f"{rows} that were in the store before" in out
    kit.assert_same_store(store, undisturbed)


def test_a_killed_worker_costs_nothing(kit, field, undisturbed, tmp_path):
    store = tmp_path / "grid.h5"
    killed = []

    def kill_once(progress):
        if progress.done >= 3 and not killed:
            for child in children(os.getpid()):
                os.kill(child, signal.SIGKILL)
                killed.append(child)

    oscsolve.solve_grid(field, store, workers=2, progress=kill_once, **kit.ASKED)
    assert len(killed) == 2
    kit.assert_same_store(store, undisturbed)


def children(parent: int) -> list[int]:
    """Worker processes of a process: those that Python's pools have started."""
    found = []
    for entry in Path("/proc").iterdir():
        if entry.name.isdigit():
            try:
                owner = int((entry / "stat").read_text().rpartition(")")[2].split()[1])
                command = (entry / "cmdline").read_bytes()
            except OSError:
                continue
            if owner == parent and b"spawn_main" in command:
                found.append(int(entry.name))
    return found


def test_a_model_that_ends_its_worker_twice_is_a_failed_row(kit, tmp_path):
    models = [oscsolve.polytrope(1.5), kit.deadly_star(), oscsolve.polytrope(2.0)]
    store = tmp_path / "grid.h5"
    summary = oscsolve.solve_grid(models, store, workers=1, **kit.ASKED)
    assert (summary.complete, summary.failed) == (2, 1)
    grid = oscsolve.load_grid(store)
    assert list(grid.status) == ["complete", "failed", "complete"]
    assert grid.message[1] == "its worker process died 2 times: out of memory?"


def test_an_interrupt_does_not_wait_for_slow_models(kit, tmp_path):
    def interrupt(progress):
        if progress.done == 1:
            raise KeyboardInterrupt

    models = [oscsolve.polytrope(1.5), kit.slow_star(600.0), kit.slow_star(600.0, 2.0)]
    with pytest.raises(KeyboardInterrupt):
        oscsolve.solve_grid(
            models, tmp_path / "grid.h5", workers=2, progress=interrupt, **kit.ASKED
        )
    assert len(oscsolve.load_grid(tmp_path / "grid.h5")) == 1
    assert children(os.getpid()) == []


def test_a_second_run_on_the_same_store_is_refused(kit, field, tmp_path):
    store = tmp_path / "grid.h5"
    refused = []

    def try_another(progress):
        if progress.done == 1:
            other = kit.start_grid(*field, "--store", store, *OPTIONS)
            refused.append((*other.communicate(timeout=60), other.returncode))

    with kit.Inline() as pool:
        oscsolve.solve_grid(field[:2], store, executor=pool, progress=try_another, **kit.ASKED)
    ((out, err, status),) = refused
    assert (out, status) == ("", 2)
    assert err.startswith(f"oscsolve: {store}: another run is writing this store (process ")
    assert len(err.splitlines()) == 1


def test_a_full_disk_ends_in_one_line_and_room_on_it_lets_the_run_go_on(
    kit, field, undisturbed, tmp_path
):
    store = tmp_path / "grid.h5"
    script = (
        "import resource, sys\n"
        "from oscsolve.cli.main import main\n"
        "if __name__ == '__main__':\n"
        "    resource.setrlimit(resource.RLIMIT_FSIZE, (int(sys.argv[1]), -1))\n"
        "    sys.exit(main(['grid', *sys.argv[2:]]))\n"
    )
    (tmp_path / "limited.py").write_text(script)
    command = [sys.executable, tmp_path / "limited.py"]
    arguments = [*field, "--store", store, *OPTIONS]
    # A store without rows takes 35 kB, the rows of the journal 19 kB, the whole store 48 kB.
    for limit, rows in ((20_000, 0), (42_000, kit.STARS)):
        ended = subprocess.run(
            [*map(str, command), str(limit), *map(str, arguments)],
            capture_output=True,
            text=True,
            check=False,
        )
        assert ended.returncode == 2, ended.stderr
        lines = [line for line in ended.stderr.splitlines() if "models," not in line]
        assert len(lines) == 1 and "grid.h5: cannot be written (File too large" in lines[0]
        assert rows_on_disk(store) == rows
    assert not oscsolve.load_grid(store).finished
    with kit.Inline() as pool:
        summary = oscsolve.solve_grid(field, store, executor=pool, **kit.ASKED)
    assert (summary.kept, summary.solved) == (kit.STARS, 0)
    kit.assert_same_store(store, undisturbed)


def test_a_script_without_a_guard_is_told_what_to_do(field, tmp_path):
    script = tmp_path / "script.py"
    script.write_text(
        "import sys, oscsolve\noscsolve.solve_grid([sys.argv[1]], sys.argv[2], degrees=[0])\n"
    )
    ended = subprocess.run(
        [sys.executable, script, str(field[0]), str(tmp_path / "grid.h5")],
        capture_output=True,
        text=True,
        check=False,
        timeout=60,
    )
    assert ended.returncode == 1
    last = ended.stderr.splitlines()[-1]
    assert "worker processes die as they start. In a script, call solve_grid under 'if" in last


def test_workers_find_compiled_code_where_the_first_has_left_it(field, tmp_path, monkeypatch):
    """A copy of the package of which one file is newer than its compiled code: it is compiled once
    more, for both workers."""
    package = Path(oscsolve.__file__).parent
    copy = tmp_path / "copy" / "oscsolve"
    shutil.copytree(package, copy)
    with (copy / "pulsation" / "eigenfunction.py").open("a") as source:
        source.write("# newer\n")
    monkeypatch.setenv("PYTHONPATH", str(copy.parent))
    monkeypatch.setenv("NUMBA_DEBUG_CACHE", "1")
    script = (
        "import sys, oscsolve\n"
        "if __name__ == '__main__':\n"
        "    summary = oscsolve.solve_grid(\n"
        "        sys.argv[2:], sys.argv[1], degrees=[0], band=(3, 30), unit='sigma2', workers=2\n"
        "    )\n"
        "    print(oscsolve.__file__, summary.complete)\n"
    )
    (tmp_path / "script.py").write_text(script)
    ended = subprocess.run(
        [sys.executable, tmp_path / "script.py", tmp_path / "grid.h5", *field[:4]],
        capture_output=True,
        text=True,
        check=False,
        cwd=tmp_path,
    )
    assert ended.returncode == 0, ended.stderr
    lines = ended.stdout.splitlines()
    assert lines[-1] == f"{copy / '__init__.py'} 4"
    saved = [line.split("saved to ")[1] for line in lines if "data saved" in line]
    assert any("eigenfunction.momenta" in name for name in saved)
    assert len(saved) == len(set(saved)), "compiled more than once"
