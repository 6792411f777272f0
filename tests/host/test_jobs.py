"""The subprocess: progress, endings of every kind, and that no process is left behind."""

from __future__ import annotations

import json
import os
import signal
import subprocess
import sys
import time
from pathlib import Path

import pytest

bpy = pytest.importorskip("bpy")

from cases import case_of  # noqa: E402
from fluxface.addon import jobs, preferences  # noqa: E402
from fluxface.solver.case import Convection, Tag, write_case  # noqa: E402
from fluxface.solver.errors import Trouble  # noqa: E402
from fluxface.solver.result import read_field  # noqa: E402
from shapes import box, facing, tagged  # noqa: E402

SECONDS_MAX = 20.0


def python(code: str) -> jobs.Job:
    return jobs.Job([sys.executable, "-c", code])


def ending_of(job: jobs.Job) -> jobs.Ending:
    return until(job.poll)


def until(found):
    """What ``found`` gives once it gives something."""
    deadline = time.monotonic() + SECONDS_MAX
    while time.monotonic() < deadline:
        if (value := found()) is not None:
            return value
        time.sleep(0.01)
    raise AssertionError("it took too long")


def is_alive(process: int) -> bool:
    """A process that has ended and that nobody has asked about is not alive."""
    try:
        return Path(f"/proc/{process}/stat").read_text().rpartition(")")[2].split()[0] != "Z"
    except (FileNotFoundError, ProcessLookupError):
        return False


LINE = json.dumps({"stage": "solve", "fraction": 0.5, "text": "half-way"})


def test_progress_is_taken_in_among_other_output():
    job = python(f"print('a library says hello'); print('{LINE}'); print('[1, 2]')")
    assert ending_of(job) == jobs.Ending(said="[1, 2]")
    assert job.progress == jobs.Progress("solve", 0.5, "half-way")


def test_progress_is_seen_while_the_solver_runs():
    job = python(f"import sys, time; print('{LINE}', flush=True); time.sleep(60)")
    assert job.poll() is None
    until(lambda: job.poll() or job.progress.fraction or None)
    assert job.progress.text == "half-way"
    job.cancel()
    assert ending_of(job).cancelled


def test_the_solvers_own_trouble_comes_through_whole():
    said = Trouble("geometry", "The surface is open.", "Close it.", faces=[3, 4], points=[[1.0, 2.0, 3.0]])
    job = python(
        f"import sys; print('noise', file=sys.stderr); print({said.as_json()!r}, file=sys.stderr); sys.exit(3)"
    )
    trouble = ending_of(job).trouble
    assert (trouble.kind, trouble.message, trouble.mend) == ("geometry", "The surface is open.", "Close it.")
    assert (list(trouble.faces), list(trouble.points)) == ([3, 4], [[1.0, 2.0, 3.0]])


def test_a_crash_is_told_with_its_last_words():
    trouble = ending_of(python("raise RuntimeError('out of luck')")).trouble
    assert trouble.message == "The solver broke off with an error of its own: RuntimeError: out of luck"


def test_a_solver_killed_from_outside_is_told_in_one_sentence():
    job = python("import os, signal; os.kill(os.getpid(), signal.SIGKILL)")
    assert ending_of(job).trouble.message == "The solver was stopped before it was done."


def test_a_missing_program_is_told():
    with pytest.raises(Trouble, match="The solver could not be started: No such file or directory"):
        jobs.Job(["/nowhere/python"])


def test_a_missing_library_is_told_by_name():
    with pytest.raises(Trouble, match="The solver's library 'no_such_library' is missing"):
        jobs.environment(["numpy", "no_such_library"])


def test_the_solvers_libraries_are_found_and_not_imported():
    code = (
        "import sys; from fluxface.addon import jobs; path = jobs.environment()['PYTHONPATH'];"
        "print([name for name in ('scipy', 'tetgen', 'pyamg') if name in sys.modules]); print(path)"
    )
    said = subprocess.run([sys.executable, "-c", code], capture_output=True, text=True, check=True).stdout.splitlines()
    # The host itself may say something before.
    imported, path = said[-2:]
    assert imported == "[]"
    assert str(jobs.SOLVER.parent) in path.split(os.pathsep)


def test_the_solver_runs_with_nothing_but_the_path_it_is_given(tmp_path):
    job = jobs.Job(jobs.command("check", str(tmp_path)), jobs.environment())
    assert ending_of(job).trouble.message.startswith("case.json cannot be read")


GRANDCHILD = "import subprocess, sys, time; print(subprocess.Popen(['sleep', '60']).pid, flush=True); time.sleep(60)"


@pytest.mark.skipif(sys.platform == "win32", reason="looks into /proc")
def test_cancel_ends_the_solver_and_what_it_started():
    job = jobs.Job([sys.executable, "-c", GRANDCHILD])
    grandchild = int(until(lambda: None if job._lines.empty() else job._lines.get()))
    assert is_alive(grandchild)
    job.cancel()
    assert ending_of(job) == jobs.Ending(cancelled=True)
    assert not is_alive(grandchild)


def test_what_a_cancelled_solver_leaves_in_its_temporary_folder_goes_with_it():
    code = "import tempfile, time; print(tempfile.mkdtemp(), flush=True); time.sleep(60)"
    job = python(code)
    left = Path(until(lambda: None if job._lines.empty() else job._lines.get()))
    assert left.is_dir()
    job.cancel()
    ending_of(job)
    assert not left.parent.exists()


@pytest.mark.skipif(sys.platform == "win32", reason="looks into /proc")
def test_stop_all_leaves_no_process():
    sleepers = [python("import time; time.sleep(60)") for _ in range(3)]
    processes = [job._process.pid for job in sleepers]
    assert all(map(is_alive, processes))
    jobs.stop_all()
    assert not any(map(is_alive, processes))


PARENT = """
import subprocess, sys, time
child = subprocess.Popen([sys.executable, *sys.argv[1:]], stdin=subprocess.PIPE, start_new_session=True)
print(child.pid, flush=True)
time.sleep(60)
"""


@pytest.mark.skipif(sys.platform == "win32", reason="looks into /proc")
def test_a_host_that_dies_takes_the_solver_along(tmp_path):
    package = tmp_path / "sleeper"
    package.mkdir()
    (package / "__init__.py").touch()
    (package / "__main__.py").write_text("import time; time.sleep(60)")
    command = [sys.executable, "-c", PARENT, str(Path(jobs.__file__).with_name("solver_process.py")), "sleeper"]
    environment = {**os.environ, "PYTHONPATH": str(tmp_path)}
    with subprocess.Popen(command, stdout=subprocess.PIPE, text=True, env=environment) as parent:
        child = int(parent.stdout.readline())
        assert is_alive(child)
        parent.send_signal(signal.SIGKILL)
    until(lambda: None if is_alive(child) else True)


def test_an_older_result_is_put_back_after_an_end_in_mid_writing(tmp_path):
    half = tmp_path / ".result-x1"
    (half / "stale").mkdir(parents=True)
    (half / "stale" / "summary.json").write_text("{}")
    (half / "fresh").mkdir()
    jobs.clear_remains(tmp_path / "result")
    assert [path.name for path in tmp_path.iterdir()] == ["result"]
    assert (tmp_path / "result" / "summary.json").exists()


# The worker -----------------------------------------------------------------------------------------------------------


def cube(folder: Path, heat: float = 1.0, size: float = 0.005) -> Path:
    """The case folder of an invented cube, coarse."""
    surface = tagged(tagged(box((0.02, 0.02, 0.02)), 0, facing("-z")), 1, facing("+z"))
    air = Tag("air", convection=Convection(ambient=300.0, coefficient=10.0))
    write_case(case_of(surface, [Tag("pad", heat=heat), air], order=1, size=size), folder)
    return folder


def workers() -> list[jobs.Worker]:
    return [job for job in jobs._live if isinstance(job, jobs.Worker)]


@pytest.fixture
def no_worker():
    jobs.stop_all()
    yield
    jobs.stop_all()


def test_one_worker_serves_run_after_run(tmp_path, no_worker):
    for heat in (1.0, 2.0):
        case = cube(tmp_path / "case", heat)
        assert ending_of(jobs.solve(case, case / "result")) == jobs.Ending()
        assert (case / "result" / "summary.json").is_file()
    assert len(workers()) == 1
    summary = json.loads((tmp_path / "case" / "result" / "summary.json").read_text())
    assert summary["reused"] == ["mesh", "matrix", "solver"]
    assert summary["balance"]["in"] == pytest.approx(2.0)


def test_a_worker_that_was_killed_is_followed_by_another(tmp_path, no_worker):
    case = cube(tmp_path / "case")
    assert ending_of(jobs.solve(case, case / "result")) == jobs.Ending()
    (worker,) = workers()
    os.kill(worker._process.pid, signal.SIGKILL)
    worker._process.wait()
    assert ending_of(jobs.solve(case, case / "result")) == jobs.Ending()


@pytest.mark.skipif(sys.platform == "win32", reason="stops a process by a signal")
def test_a_worker_killed_while_it_is_asked_is_told_and_the_next_run_works(tmp_path, no_worker):
    case = cube(tmp_path / "case")
    assert ending_of(jobs.solve(case, case / "result")) == jobs.Ending()
    (worker,) = workers()
    os.kill(worker._process.pid, signal.SIGSTOP)
    request = jobs.solve(case, case / "result")
    os.kill(worker._process.pid, signal.SIGKILL)
    assert ending_of(request).trouble.message == "The solver was stopped before it was done."
    assert ending_of(jobs.solve(case, case / "result")) == jobs.Ending()


def test_cancelling_ends_the_worker_and_leaves_the_older_result(tmp_path, no_worker):
    case = cube(tmp_path / "case")
    assert ending_of(jobs.solve(case, case / "result")) == jobs.Ending()
    (worker,) = workers()
    request = jobs.solve(case, case / "result")
    request.cancel()
    assert ending_of(request) == jobs.Ending(cancelled=True)
    assert worker.has_ended
    jobs.clear_remains(case / "result")
    assert (case / "result" / "summary.json").is_file()


def test_the_workers_own_trouble_comes_through_whole(tmp_path, no_worker):
    trouble = ending_of(jobs.solve(tmp_path / "none", tmp_path / "result")).trouble
    assert trouble.kind == "case"
    assert trouble.message.startswith("case.json cannot be read")


@pytest.fixture
def chosen():
    """The preferences, as the host keeps them of an add-on that is installed."""
    enabled = bpy.context.preferences.addons.new()
    enabled.module = preferences.ADD_ON
    preferences.register()
    yield enabled.preferences
    preferences.unregister()
    bpy.context.preferences.addons.remove(enabled)


def test_another_number_of_threads_is_another_worker_and_the_same_temperatures(tmp_path, no_worker, chosen):
    temperatures = []
    for count in (1, 2):
        chosen.threads = count
        case = cube(tmp_path / f"case{count}", size=0.0012)
        assert ending_of(jobs.solve(case, case / "result")) == jobs.Ending()
        (worker,) = workers()
        assert worker.threads == count
        temperatures.append(read_field(case / "result").temperature)
    assert len(temperatures[0]) > 5_000  # enough to be solved piece by piece
    assert temperatures[0] == pytest.approx(temperatures[1], rel=1e-10)


@pytest.mark.skipif(not Path("/proc/self/environ").exists(), reason="looks into /proc")
def test_the_solver_is_told_how_many_threads_and_gives_way_to_the_host(tmp_path, no_worker, chosen):
    chosen.threads = 1
    case = cube(tmp_path / "case")
    assert ending_of(jobs.solve(case, case / "result")) == jobs.Ending()
    (worker,) = workers()
    process = worker._process.pid
    assert b"FLUXFACE_THREADS=1" in Path(f"/proc/{process}/environ").read_bytes().split(b"\0")
    assert os.getpriority(os.PRIO_PROCESS, process) > os.getpriority(os.PRIO_PROCESS, 0)
