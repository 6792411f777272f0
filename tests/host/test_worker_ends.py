"""However the worker, its host or the disk fails: it is told, the older result stays, and the next run works."""

from __future__ import annotations

import os
import shutil
import signal
import subprocess
import sys
import time
from collections.abc import Callable, Iterator
from pathlib import Path
from typing import TypeVar

import pytest

pytest.importorskip("bpy")
resource = pytest.importorskip("resource", reason="limits and signals of POSIX")

from cases import case_of  # noqa: E402
from fluxface.addon import jobs  # noqa: E402
from fluxface.solver.case import Convection, Tag, write_case  # noqa: E402
from fluxface.solver.result import read_summary  # noqa: E402
from shapes import box, facing, tagged  # noqa: E402

pytestmark = pytest.mark.skipif(not Path("/proc/self/stat").exists(), reason="looks into /proc")

SECONDS_MAX = 60.0
Found = TypeVar("Found")


def block(folder: Path, heat: float = 1.0, size: float = 0.0015) -> Path:
    """The case folder of an invented cube, fine enough for each stage to be caught at work."""
    surface = tagged(tagged(box((0.02, 0.02, 0.02)), 0, facing("-z")), 1, facing("+z"))
    air = Tag("air", convection=Convection(ambient=300.0, coefficient=10.0))
    write_case(case_of(surface, [Tag("pad", heat=heat), air], size=size), folder)
    return folder


def until(found: Callable[[], Found | None]) -> Found:
    deadline = time.monotonic() + SECONDS_MAX
    while time.monotonic() < deadline:
        if (value := found()) is not None:
            return value
        time.sleep(0.002)
    raise AssertionError("it took too long")


def in_session(leader: int) -> list[int]:
    """The living processes that the worker started or is."""
    found = []
    for folder in Path("/proc").glob("[0-9]*"):
        try:
            state, _, _, session = (folder / "stat").read_text().rpartition(")")[2].split()[:4]
        except OSError:  # it has just ended
            continue
        if int(session) == leader and state != "Z":
            found.append(int(folder.name))
    return found


def the_worker() -> jobs.Worker:
    (worker,) = (job for job in jobs._live if isinstance(job, jobs.Worker) and not job.has_ended)
    return worker


def heat_in(case: Path) -> float:
    return read_summary(case / "result")["balance"]["in"]


@pytest.fixture(autouse=True)
def no_worker() -> Iterator[None]:
    jobs.stop_all()
    yield
    jobs.stop_all()


@pytest.mark.slow
@pytest.mark.parametrize("stage", ["mesh", "solve", "write"])
def test_a_worker_killed_at_work_is_told_and_nothing_is_lost(tmp_path: Path, stage: str) -> None:
    case = block(tmp_path / "case", 1.0, 0.005)
    assert until(jobs.solve(case, case / "result").poll) == jobs.Ending()
    block(case, 2.0)
    request = jobs.solve(case, case / "result")
    process = the_worker()._process.pid
    until(lambda: request.poll() or (request.progress.stage == stage and request.progress.text != "Starting") or None)
    os.kill(process, signal.SIGKILL)
    assert until(request.poll).trouble.message == "The solver was stopped before it was done."
    jobs.clear_remains(case / "result")
    assert heat_in(case) == pytest.approx(1.0)
    until(lambda: None if in_session(process) else True)
    assert until(jobs.solve(case, case / "result").poll) == jobs.Ending()
    assert heat_in(case) == pytest.approx(2.0)


def test_a_full_disk_is_told_and_leaves_the_older_result(tmp_path: Path) -> None:
    case = block(tmp_path / "case", 1.0, 0.005)
    assert until(jobs.solve(case, case / "result").poll) == jobs.Ending()
    process = the_worker()._process.pid
    _, most = resource.prlimit(process, resource.RLIMIT_FSIZE)
    resource.prlimit(process, resource.RLIMIT_FSIZE, (2_000, most))
    block(case, 2.0, 0.005)
    trouble = until(jobs.solve(case, case / "result").poll).trouble
    assert trouble.kind == "limits"
    assert trouble.message.startswith("The result cannot be written to")
    assert heat_in(case) == pytest.approx(1.0)
    assert [path.name for path in case.glob(".result*")] == []
    resource.prlimit(process, resource.RLIMIT_FSIZE, (most, most))
    assert until(jobs.solve(case, case / "result").poll) == jobs.Ending()
    assert the_worker()._process.pid == process
    assert heat_in(case) == pytest.approx(2.0)


def test_a_folder_that_went_away_between_runs_is_no_trouble(tmp_path: Path) -> None:
    case = block(tmp_path / "case", 1.0, 0.005)
    assert until(jobs.solve(case, case / "result").poll) == jobs.Ending()
    shutil.rmtree(case)
    assert until(jobs.solve(case, case / "result").poll).trouble.kind == "case"
    block(case, 2.0, 0.005)
    assert until(jobs.solve(case, case / "result").poll) == jobs.Ending()
    assert heat_in(case) == pytest.approx(2.0)


HOST = """
import sys, time
from pathlib import Path
from fluxface.addon import jobs
case, stage = Path(sys.argv[1]), sys.argv[2]
request = jobs.solve(case, case / "result")
worker = next(job for job in jobs._live)
while request.poll() is None:
    if request.progress.stage == stage and request.progress.text != "Starting":
        print(worker._process.pid, flush=True)
        time.sleep(60)
    time.sleep(0.01)
"""


@pytest.mark.slow
@pytest.mark.parametrize(("stage", "end"), [("mesh", signal.SIGKILL), ("solve", signal.SIGTERM)])
def test_a_host_that_ends_in_mid_run_leaves_no_process(tmp_path: Path, stage: str, end: signal.Signals) -> None:
    case = block(tmp_path / "case")
    command = [sys.executable, "-c", HOST, str(case), stage]
    with subprocess.Popen(command, stdout=subprocess.PIPE, text=True) as host:
        lines = iter(host.stdout.readline, "")
        worker = next(int(line) for line in lines if line.strip().isdecimal())  # the host may say something before
        assert worker in in_session(worker)
        host.send_signal(end)
    until(lambda: None if in_session(worker) else True)


def test_an_answer_is_never_missed_however_often_it_is_asked_for(tmp_path: Path) -> None:
    case = block(tmp_path / "case", 1.0, 0.005)
    for _ in range(5):
        request = jobs.solve(case, case / "result")
        deadline = time.monotonic() + SECONDS_MAX
        while (ending := request.poll()) is None:
            assert time.monotonic() < deadline
        assert ending == jobs.Ending()


@pytest.mark.slow
def test_two_hosts_at_work_on_one_folder_leave_a_whole_result(tmp_path: Path) -> None:
    case = block(tmp_path / "case")
    ask = HOST.replace("== stage", "is None")
    hosts = [subprocess.Popen([sys.executable, "-c", ask, str(case), "none"]) for _ in range(2)]
    try:
        assert [host.wait(SECONDS_MAX) for host in hosts] == [0, 0]
    finally:
        for host in hosts:
            host.kill()
    assert heat_in(case) == pytest.approx(1.0)
    assert [path.name for path in case.glob(".result*")] == []
