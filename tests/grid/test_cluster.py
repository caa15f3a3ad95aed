"""A grid on a Dask cluster of separate processes, undisturbed and with workers killed."""

from __future__ import annotations

import os
import signal
import sys

import pytest

import oscsolve
from oscsolve.errors import IncompleteError, InputError, MissingPackageError
from oscsolve.grid.cluster import cluster

pytest.importorskip("distributed", reason="dask.distributed (the extra 'cluster') is not installed")

# Dask and tornado raise warnings of their own (sockets and loops closed late) that are not ours.
pytestmark = [
    pytest.mark.filterwarnings("ignore:::distributed"),
    pytest.mark.filterwarnings("ignore:::tornado"),
    pytest.mark.filterwarnings("ignore::ResourceWarning"),
    pytest.mark.filterwarnings("ignore::pytest.PytestUnraisableExceptionWarning"),
]


@pytest.fixture(scope="module")
def local(tmp_path_factory):
    """Two workers in processes of their own, without a page on the network."""
    import dask
    from distributed import LocalCluster

    folder = tmp_path_factory.mktemp("dask")
    with (
        dask.config.set(
            {
                "temporary-directory": str(folder),
                # A task that has ended two workers is given up, not only one that has ended four.
                "distributed.scheduler.allowed-failures": 1,
            }
        ),
        LocalCluster(
            n_workers=2,
            threads_per_worker=1,
            processes=True,
            dashboard_address=None,
            host="127.0.0.1",
        ) as made,
    ):
        yield made


@pytest.fixture
def client(local):
    from distributed import Client

    with Client(local, set_as_default=False) as opened:
        opened.wait_for_workers(2, timeout=60)
        yield opened


def test_a_client_and_its_executor_leave_the_same_store(kit, client, field, undisturbed, tmp_path):
    for name, executor in (("a", client), ("b", client.get_executor())):
        told = []
        store = tmp_path / f"{name}.h5"
        summary = oscsolve.solve_grid(
            field, store, executor=executor, progress=told.append, **kit.ASKED
        )
        assert summary.complete == kit.STARS
        assert told[-1].workers == 2
        kit.assert_same_store(store, undisturbed)


def test_a_worker_killed_midway_costs_nothing(kit, client, field, undisturbed, tmp_path):
    workers = client.run(os.getpid)
    assert len(set(workers.values())) == 2
    killed = []

    def kill_one(progress):
        if progress.done == 3:
            killed.append(next(iter(workers.values())))
            os.kill(killed[0], signal.SIGKILL)

    store = tmp_path / "grid.h5"
    oscsolve.solve_grid(field, store, executor=client, progress=kill_one, **kit.ASKED)
    assert killed
    kit.assert_same_store(store, undisturbed)


def test_a_model_that_ends_every_worker_is_a_failed_row(kit, client, field, tmp_path):
    from distributed import WorkerPlugin

    # Classes made in a function are sent to the workers as they stand.
    class Deadly(WorkerPlugin):
        def setup(self, worker):
            from oscsolve.grid import work

            read = work.read_model

            def read_or_die(path, **keywords):
                return os._exit(9) if "lantern-2." in path else read(path, **keywords)

            work.read_model = read_or_die

    client.register_plugin(Deadly(), name="deadly")
    store = tmp_path / "grid.h5"
    try:
        summary = oscsolve.solve_grid(field[:4], store, executor=client, **kit.ASKED)
    finally:
        client.unregister_worker_plugin("deadly")
        client.restart()
    assert (summary.complete, summary.failed) == (3, 1)
    grid = oscsolve.load_grid(store)
    assert list(grid.status) == ["complete", "failed", "complete", "complete"]
    assert grid.message[1].startswith("KilledWorker: ")


def test_the_command_works_behind_an_address(kit, local, field, undisturbed, tmp_path):
    store = tmp_path / "grid.h5"
    ended = kit.start_grid(
        *field, "--store", store, "--degrees", "0-1", "--band", "3:30sigma2",
        "--cluster", local.scheduler_address,
    )  # fmt: skip
    out, err = ended.communicate(timeout=120)
    assert ended.returncode == 0, err
    assert f"{kit.STARS} complete" in out
    assert all(line.startswith("oscsolve: ") for line in err.splitlines())
    kit.assert_same_store(store, undisturbed)


def test_a_cluster_that_goes_away_is_one_line_and_keeps_the_rows(kit, field, undisturbed, tmp_path):
    from distributed import Client, LocalCluster

    store = tmp_path / "grid.h5"
    with (
        LocalCluster(
            n_workers=1, threads_per_worker=1, dashboard_address=None, host="127.0.0.1"
        ) as made,
        Client(made, set_as_default=False) as opened,
    ):

        def close(progress):
            if progress.done == 4:
                made.close()

        with pytest.raises(IncompleteError, match="the executor gave up"):
            oscsolve.solve_grid(field, store, executor=opened, progress=close, **kit.ASKED)
    with kit.Inline() as pool:
        summary = oscsolve.solve_grid(field, store, executor=pool, **kit.ASKED)
    assert summary.kept == 4
    kit.assert_same_store(store, undisturbed)


def test_an_address_where_nobody_answers_is_one_line(monkeypatch):
    monkeypatch.setattr("oscsolve.grid.cluster._PATIENCE", 1)
    refused = pytest.raises(InputError, match="no scheduler answers at tcp://127.0.0.1:9 ")
    with refused, cluster("tcp://127.0.0.1:9"):
        pass


def test_a_missing_package_is_told_with_the_line_that_installs_it(monkeypatch):
    monkeypatch.setitem(sys.modules, "distributed", None)
    refused = pytest.raises(MissingPackageError, match=r"pip install 'oscsolve\[cluster\]'")
    with refused, cluster("tcp://127.0.0.1:9"):
        pass
