"""Whoever computes the blocks, the trials are the same bytes; what was finished is not lost."""

from __future__ import annotations

import dataclasses
import importlib
import os
import signal
import subprocess
import sys
import time
from pathlib import Path
from types import ModuleType

import numpy as np
import pytest

from beforehand.faults import InputError
from beforehand.plan import plan_from_mapping
from beforehand.rehearsing.engines import (
    Engine,
    Interrupted,
    Saved,
    WorkerLostError,
    rehearsal_key,
    run_world,
)
from beforehand.rehearsing.engines.blocks import blocks_of
from beforehand.rehearsing.engines.pace import left
from beforehand.rehearsing.trials import Trials

HERE = Path(__file__).parent
PLAN = {
    "language": 1,
    "title": "t",
    "question": "q",
    "data": {"file": "t.csv"},
    "outcome": {"column": "y"},
    "predictors": [{"column": "a"}, {"column": "b"}],
}


def same(one: Trials, other: Trials) -> bool:
    """Whether every array has the same type, shape and bytes."""
    pairs = [(getattr(one, f.name), getattr(other, f.name)) for f in dataclasses.fields(Trials)]
    return all(a.dtype == b.dtype and a.shape == b.shape and a.tobytes() == b.tobytes() for a, b in pairs)


@pytest.fixture
def toys(monkeypatch: pytest.MonkeyPatch) -> ModuleType:
    """The module of worlds, which processes that are begun from here can import too."""
    from joblib.externals.loky import get_reusable_executor

    # Processes that another test began do not know this folder.
    get_reusable_executor().shutdown(wait=True)
    monkeypatch.syspath_prepend(str(HERE))
    monkeypatch.setenv("PYTHONPATH", os.pathsep.join(sys.path))
    return importlib.import_module("toy_worlds")


def test_blocks_cover_every_replicate_once_and_do_not_hang_on_the_number():
    """A longer rehearsal has the blocks of a shorter one, but for its last."""
    assert blocks_of(120, 50) == ((0, 50), (50, 100), (100, 120))
    assert blocks_of(1, 50) == ((0, 1),)
    assert blocks_of(500, 50)[:2] == blocks_of(120, 50)[:2]


@pytest.mark.parametrize("block", [1, 7, 50, 1000])
def test_the_size_of_blocks_changes_no_byte(toys, block):
    """Each replicate has its own random numbers."""
    assert same(run_world(toys.Toy(), 120, block=block), toys.Toy().trials(0, 120))


def test_two_workers_give_the_bytes_of_one(toys, tmp_path):
    """And both of them, not this process, did the work."""
    one = run_world(toys.Toy(), 330)
    world = toys.Toy(folder=str(tmp_path), pause=0.05)
    two = run_world(world, 330, engine=Engine(workers=2))
    assert same(one, two)
    workers = {name.name.split("-")[1] for name in tmp_path.iterdir()}
    assert len(workers) == 2
    assert str(os.getpid()) not in workers


def test_a_block_is_computed_on_one_thread(monkeypatch):
    """The limit holds inside, and only there."""
    from threadpoolctl import threadpool_info

    found: list[int] = []

    class Asks:
        name = "asks"

        def trials(self, first: int, last: int) -> Trials:
            found.extend(info["num_threads"] for info in threadpool_info())
            raise ZeroDivisionError

    before = [info["num_threads"] for info in threadpool_info()]
    with pytest.raises(ZeroDivisionError):
        run_world(Asks(), 1)
    assert found
    assert set(found) == {1}
    assert [info["num_threads"] for info in threadpool_info()] == before


def test_a_worker_that_is_ended_from_outside_is_one_clear_line(toys):
    """No traceback of the pool of processes."""
    with pytest.raises(WorkerLostError, match="ended from outside") as caught:
        run_world(toys.Toy(last_words=120), 200, engine=Engine(workers=2))
    assert "\n" not in str(caught.value)
    assert caught.value.exit_code == 2


def test_an_error_of_the_program_keeps_its_traceback():
    """It is not taken for something else."""

    class Broken:
        name = "broken"

        def trials(self, first: int, last: int) -> Trials:
            raise ZeroDivisionError

    with pytest.raises(ZeroDivisionError):
        run_world(Broken(), 10)


def test_progress_tells_what_is_done_and_what_time_is_left(toys):
    """Thousands have their comma; nothing is left at the end."""
    said: list[str] = []
    run_world(toys.Toy(pause=0.01), 1050, progress=said.append, block=350)
    assert said[0] == "toy: 0 of 1,050"
    assert said[1].startswith("toy: 350 of 1,050, ")
    assert said[1].endswith(" s left")
    assert said[-1] == "toy: 1,050 of 1,050"


@pytest.mark.parametrize(
    ("seconds", "text"),
    [(0.0, "1 s"), (11.2, "12 s"), (90.0, "90 s"), (91.0, "2 min"), (5400.0, "90 min"), (5401.0, "2 h")],
)
def test_time_left_is_in_the_unit_that_a_person_would_use(seconds, text):
    """Rounded up: work is not done before it is done."""
    assert left(seconds) == text


# ---- interrupted and resumed ----


def test_interrupted_and_resumed_gives_the_same_bytes(toys, tmp_path):
    """Only what was not finished is computed again."""
    path, whole = tmp_path / "a.rehearsal.part", run_world(toys.Toy(), 230)
    with Saved(path, "k", resume=False) as saved, pytest.raises(Interrupted) as caught:
        run_world(toys.Toy(interrupt_at=100), 230, saved=saved)
    assert (caught.value.world, caught.value.done, caught.value.of) == ("toy", 100, 230)
    assert caught.value.trials is not None
    assert same(caught.value.trials, run_world(toys.Toy(), 100))
    (tmp_path / "marks").mkdir()
    said: list[str] = []
    with Saved(path, "k", resume=True) as saved:
        again = run_world(toys.Toy(folder=str(tmp_path / "marks")), 230, saved=saved, progress=said.append)
        saved.remove()
    assert same(again, whole)
    assert said[0] == "toy: 100 of 230"
    assert sorted(name.name.split("-")[0] for name in (tmp_path / "marks").iterdir()) == ["100", "150", "200"]
    assert not path.exists()


def test_an_interrupt_of_the_whole_group_leaves_what_is_done(toys, tmp_path):
    """As Ctrl-C in a terminal: every process of the group hears it, and the first one answers for all."""
    path = tmp_path / "a.rehearsal.part"
    code = (
        "from pathlib import Path; from toy_worlds import Toy\n"
        "from beforehand.rehearsing.engines import *\n"
        f"with Saved(Path({str(path)!r}), 'k', resume=False) as saved:\n"
        "    try:\n"
        "        run_world(Toy(pause=0.2), 3000, engine=Engine(workers=2), saved=saved,"
        " progress=lambda text: print(text, flush=True))\n"
        "    except Interrupted as stopped:\n"
        "        print('stopped', stopped.done, flush=True)\n"
    )
    running = subprocess.Popen(
        [sys.executable, "-c", code], stdout=subprocess.PIPE, stderr=subprocess.PIPE, text=True,
        start_new_session=True,
    )  # fmt: skip
    assert running.stdout is not None
    lines = [running.stdout.readline() for _ in range(4)]
    os.killpg(running.pid, signal.SIGINT)
    rest, errors = running.communicate(timeout=60)
    assert errors == "", errors
    done = int((lines + rest.splitlines())[-1].split()[1])
    assert running.returncode == 0
    assert done >= 150
    with Saved(path, "k", resume=True) as saved:
        again = run_world(toys.Toy(), 3000, saved=saved)
    assert same(again, run_world(toys.Toy(), 3000))


def test_a_longer_rehearsal_goes_on_from_a_shorter_one(toys, tmp_path):
    """The number of replicates is no part of what a replicate depends on."""
    path = tmp_path / "a.part"
    with Saved(path, "k", resume=False) as saved:
        run_world(toys.Toy(), 120, saved=saved)
    with Saved(path, "k", resume=True) as saved:
        assert same(run_world(toys.Toy(), 300, saved=saved), run_world(toys.Toy(), 300))


def test_worlds_of_one_rehearsal_share_a_file(toys, tmp_path):
    """Each finds its own blocks."""
    path = tmp_path / "a.part"
    with Saved(path, "k", resume=False) as saved:
        run_world(toys.Toy(name="one", seed=1), 100, saved=saved)
        run_world(toys.Toy(name="two", seed=2), 100, saved=saved)
    with Saved(path, "k", resume=True) as saved:
        two = run_world(toys.Toy(name="two", interrupt_at=0), 100, saved=saved)
        one = run_world(toys.Toy(name="one", interrupt_at=0), 100, saved=saved)
    assert same(one, toys.Toy(seed=1).trials(0, 100))
    assert same(two, toys.Toy(seed=2).trials(0, 100))


@pytest.fixture
def part(toys, tmp_path) -> Path:
    """A part file with three blocks."""
    path = tmp_path / "a.part"
    with Saved(path, "k", resume=False) as saved:
        run_world(toys.Toy(), 150, saved=saved)
    return path


def test_wherever_the_file_is_cut_off_the_rest_counts(toys, part):
    """Power fails at any byte: whole blocks stay, the cut one is computed again, the file is whole after."""
    content, whole = part.read_bytes(), run_world(toys.Toy(), 150)
    for size in [0, 5, 28, 29, 30, 31, 100, len(content) // 3, len(content) // 2, len(content) - 1]:
        part.write_bytes(content[:size])
        with Saved(part, "k", resume=True) as saved:
            assert same(run_world(toys.Toy(), 150, saved=saved), whole)
        assert part.read_bytes() == content, size


def test_a_changed_byte_is_found(toys, part):
    """The block that it stands in, and those behind it, are computed again."""
    content = bytearray(part.read_bytes())
    content[len(content) // 2] ^= 1
    part.write_bytes(bytes(content))
    with Saved(part, "k", resume=True) as saved:
        assert len(saved.blocks("toy")) == 1


def test_a_part_of_another_rehearsal_is_a_fault_only_when_it_would_be_gone_on_with(part):
    """Begun anew, the old part goes."""
    with pytest.raises(InputError, match="another rehearsal"):
        Saved(part, "other", resume=True)
    with Saved(part, "other", resume=False) as saved:
        assert saved.blocks("toy") == {}
        assert part.read_bytes() == b"beforehand rehearsal part 1 other\n"
    # Nothing was finished, so that nothing is left.
    assert not part.exists()


@pytest.mark.parametrize("resume", [True, False])
def test_a_file_of_something_else_is_left_as_it_is(tmp_path, resume):
    """Whatever it is called."""
    path = tmp_path / "a.rehearsal.part"
    path.write_text("my notes\n")
    with pytest.raises(InputError, match="is not the part of a rehearsal"):
        Saved(path, "k", resume=resume)
    assert path.read_text() == "my notes\n"
    folder = tmp_path / "folder"
    folder.mkdir()
    with pytest.raises(InputError, match="cannot be read"):
        Saved(folder, "k", resume=resume)


def test_the_key_hangs_on_all_that_a_replicate_depends_on_and_on_nothing_else():
    """Words and the number of replicates change none of them."""

    def key(changes: dict[str, object], fingerprint: str | None = "f", seed: int = 1) -> str:
        return rehearsal_key(plan_from_mapping({**PLAN, **changes}), fingerprint, seed)

    plain = key({})
    assert key({"title": "another"}) == plain
    assert key({"rehearsal": {"replicates": 77, "scenarios": ["noise"]}}) == plain
    assert key({"alternatives": {"other": {"alpha": 0.2}}}) == plain
    changed = [
        key({"alpha": 0.10}), key({"expects": {"residual_sd": 1}}), key({}, "g"), key({}, None),
        key({}, seed=2), key({"rehearsal": {"folds": 5}}), key({"rehearsal": {"leave_out": "site"}}),
    ]  # fmt: skip
    assert len({plain, *changed}) == len(changed) + 1


# ---- a cluster ----


@pytest.fixture
def cluster(toys):
    """A scheduler and two workers, processes of their own on this machine."""
    from distributed import LocalCluster

    with LocalCluster(
        n_workers=2, threads_per_worker=1, processes=True, dashboard_address=None, silence_logs=50
    ) as running:
        yield running


def test_a_cluster_gives_the_same_bytes_and_a_worker_killed_in_the_middle_changes_none(toys, cluster):
    """The blocks of the dead worker are computed by the other one."""
    whole = run_world(toys.Toy(), 1000)
    engine = Engine(kind="dask", scheduler=cluster.scheduler_address)
    assert same(run_world(toys.Toy(), 1000, engine=engine), whole)
    killed: list[int] = []

    def kill_one(text: str) -> None:
        if not killed and text.startswith("toy: 200 "):
            killed.append(next(iter(cluster.workers.values())).pid)
            os.kill(killed[0], signal.SIGKILL)

    slow = toys.Toy(pause=0.1)
    assert same(run_world(slow, 1000, engine=engine, progress=kill_one), whole)
    assert killed


def test_all_workers_killed_are_waited_for(toys, cluster):
    """The world that was lost with them is sent again to those that take their place."""
    engine = Engine(kind="dask", scheduler=cluster.scheduler_address)
    killed: list[int] = []

    def kill_all(text: str) -> None:
        if not killed and text.startswith("toy: 200 "):
            killed.extend(worker.pid for worker in cluster.workers.values())
            for pid in killed:
                os.kill(pid, signal.SIGKILL)

    slow = toys.Toy(pause=0.05)
    assert same(run_world(slow, 500, engine=engine, progress=kill_all), run_world(toys.Toy(), 500))
    assert len(killed) == 2


def test_a_scheduler_that_does_not_answer_is_one_clear_line(toys, monkeypatch):
    """Nobody listens there."""
    from beforehand.rehearsing.engines import cluster

    monkeypatch.setattr(cluster, "PATIENCE", 1.0)
    started = time.monotonic()
    with pytest.raises(InputError) as caught:
        run_world(toys.Toy(), 10, engine=Engine(kind="dask", scheduler="tcp://127.0.0.1:1"))
    assert str(caught.value) == "tcp://127.0.0.1:1: no scheduler answered within 1 seconds"
    assert time.monotonic() - started < 15


@pytest.mark.parametrize(
    ("address", "what"),
    [
        (None, "--engine dask: needs the address of a scheduler: --scheduler tcp://host:8786"),
        ("", "--engine dask: needs the address of a scheduler: --scheduler tcp://host:8786"),
        ("nonsense://x", "nonsense://x: is not the address of a scheduler, such as tcp://host:8786"),
        ("tcp://127.0.0.1:port", "is not the address of a scheduler, such as tcp://host:8786"),
    ],
)
def test_an_address_that_is_none_is_one_clear_line(toys, address, what):
    """Before anything is computed."""
    with pytest.raises(InputError) as caught:
        run_world(toys.Toy(), 10, engine=Engine(kind="dask", scheduler=address))
    assert str(caught.value).endswith(what)


def test_a_cluster_without_workers_is_one_clear_line(toys, monkeypatch):
    """It would be waited for without an end."""
    from distributed import LocalCluster

    from beforehand.rehearsing.engines import cluster

    monkeypatch.setattr(cluster, "PATIENCE", 2.0)
    with LocalCluster(n_workers=0, dashboard_address=None, silence_logs=50) as running:
        engine = Engine(kind="dask", scheduler=running.scheduler_address)
        with pytest.raises(InputError, match="has had no worker for 2 seconds"):
            run_world(toys.Toy(), 10, engine=engine)


def test_interrupted_on_a_cluster_and_resumed_here_gives_the_same_bytes(toys, cluster, tmp_path):
    """Blocks are blocks, whoever computed them."""
    path = tmp_path / "a.part"

    def interrupt(text: str) -> None:
        if text.startswith("toy: 200 "):
            raise KeyboardInterrupt

    engine = Engine(kind="dask", scheduler=cluster.scheduler_address)
    with Saved(path, "k", resume=False) as saved, pytest.raises(Interrupted) as caught:
        run_world(toys.Toy(pause=0.02), 500, engine=engine, saved=saved, progress=interrupt)
    assert caught.value.done == 200
    with Saved(path, "k", resume=True) as saved:
        assert same(run_world(toys.Toy(), 500, saved=saved), run_world(toys.Toy(), 500))


def test_what_is_no_scheduler_is_one_clear_line(toys, monkeypatch):
    """A server of another kind answers there."""
    import socket
    import threading

    from beforehand.rehearsing.engines import cluster

    monkeypatch.setattr(cluster, "PATIENCE", 2.0)
    with socket.create_server(("127.0.0.1", 0)) as server:

        def answer() -> None:
            with server.accept()[0] as line:
                line.sendall(b"HTTP/1.1 400 Bad Request\r\nConnection: close\r\n\r\n" * 20)

        threading.Thread(target=answer, daemon=True).start()
        address = f"tcp://127.0.0.1:{server.getsockname()[1]}"
        with pytest.raises(InputError) as caught:
            run_world(toys.Toy(), 10, engine=Engine(kind="dask", scheduler=address))
    assert str(caught.value).startswith(f"{address}: ")
    assert len(str(caught.value).splitlines()) == 1


def test_an_error_on_a_worker_is_the_error(toys, cluster):
    """A defect of the program is not taken for a lost worker."""
    engine = Engine(kind="dask", scheduler=cluster.scheduler_address)
    with pytest.raises(TypeError):
        run_world(toys.Toy(pause=None), 10, engine=engine)


def test_arrays_are_not_what_a_loader_would_run(part):
    """A part file holds numbers only: one with a pickle in it is computed again, not opened."""
    import hashlib
    import io
    import json

    packed = io.BytesIO()
    np.savez(packed, status=np.array([object()], dtype=object))
    content = packed.getvalue()
    line = {
        "world": "toy", "first": 0, "last": 1,
        "bytes": len(content), "sha256": hashlib.sha256(content).hexdigest(),
    }  # fmt: skip
    part.write_bytes(b"beforehand rehearsal part 1 k\n" + json.dumps(line).encode() + b"\n" + content)
    with Saved(part, "k", resume=True) as saved:
        assert saved.blocks("toy") == {}
