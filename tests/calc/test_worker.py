"""The worker process and the time limit, without the program: what dies or hangs gives an error value."""

from __future__ import annotations

import json
import os
import signal
import subprocess
import sys
import time
from pathlib import Path

import pytest
from calc_session import is_alive
from misbehaving import Misbehaving

import uffuncs.calc.inside.running as running
from uffuncs.calc import inside
from uffuncs.calc.answers import stale
from uffuncs.calc.inside import configuration
from uffuncs.calc.inside.frames import MOST_BYTES
from uffuncs.calc.inside.running import Runner
from uffuncs.calc.inside.values import error_name
from uffuncs.calc.inside.worker_link import Worker
from uffuncs.calc.installation import own_settings
from uffuncs.calc.names import add_in_functions
from uffuncs.cell import call

posix = pytest.mark.skipif(os.name == "nt", reason="kills by signals, and lets /bin/false play a Python")
SIGNATURES = {f.name: [name for name, _ in f.arguments] for f in add_in_functions()}
DARCY = ("UF_FLUX_DARCY", (2.0, 1.002, 5e12, None, None, None, None))


@pytest.fixture
def misbehaving(tmp_path):
    return Misbehaving(tmp_path)


@pytest.fixture
def worker(misbehaving):
    found = Worker(misbehaving.settings(), SIGNATURES)
    yield found
    found.stop()


def error(result) -> str:
    return error_name(result[0][0])


def test_values_texts_blocks_and_errors():
    worker = Worker(own_settings(), SIGNATURES)
    try:
        flux = call("UF_FLUX_DARCY", [2.0, 1.002, 5e12])
        assert worker.call(*DARCY) == ((flux,),)
        assert worker.call("UF_VERSION", ()) == ((call("UF_VERSION", []),),)
        block = worker.call("UF_FLUX_DARCY", (((1.0,), (-1.0,), ("35 psi",), ("",)), 1.0, 5e12))
        assert [v if v == v else error_name(v) for (v,) in block] == [
            call("UF_FLUX_DARCY", [1.0, 1.0, 5e12]),
            "#NUM!",
            call("UF_FLUX_DARCY", ["35 psi", 1.0, 5e12]),
            "#VALUE!",
        ]
        numbers = tuple((0.05 * n,) for n in range(2000))
        assert worker.call("UF_FLUX_DARCY", (numbers, 1.0, 5e12)) == tuple(
            map(tuple, call("UF_FLUX_DARCY", [[list(r) for r in numbers], 1.0, 5e12]))
        )
        assert worker.call("UF_WHY", ("UF_FLUX_DARCY", "±µ", 1.0, 5e12)) == (
            (call("UF_WHY", ["UF_FLUX_DARCY", "±µ", 1.0, 5e12]),),
        )
        assert not worker.stale
    finally:
        worker.stop()


@posix
def test_started_again_once_when_killed(worker, misbehaving):
    worker.call(*DARCY)
    first = worker.process.pid
    os.kill(first, signal.SIGKILL)
    assert worker.call(*DARCY)[0][0] > 0 and worker.process.pid != first
    misbehaving.shall("die once")
    assert worker.call("UF_VERSION", ()) == (("well",),)


def test_a_call_that_always_kills_it(worker, misbehaving):
    misbehaving.shall("die")
    assert error(worker.call("UF_VERSION", ())) == "#VALUE!"
    assert worker.call(*DARCY)[0][0] > 0


@pytest.mark.parametrize("how", ["spin", "block"])
def test_a_call_that_hangs(worker, misbehaving, how):
    misbehaving.shall(how)
    process = worker.process.pid
    started = time.monotonic()
    assert error(worker.call("UF_VERSION", ())) == "#NUM!"
    assert 0.9 < time.monotonic() - started < 20
    assert not is_alive(process)
    misbehaving.shall("")
    assert worker.call("UF_VERSION", ()) == (("well",),)


def test_prints_and_interruptions_do_no_harm(worker, misbehaving):
    misbehaving.shall("print")
    assert worker.call("UF_VERSION", ()) == (("well",),)
    misbehaving.shall("raise")
    assert error(worker.call("UF_VERSION", ())) == "#VALUE!"
    misbehaving.shall("")
    assert worker.call("UF_VERSION", ()) == (("well",),)


def test_a_message_too_long_is_refused(worker):
    text = "x" * (MOST_BYTES + 1)
    process = worker.process.pid
    assert error(worker.call("UF_SOURCE", (text,))) == "#VALUE!"
    assert worker.call(*DARCY)[0][0] > 0 and worker.process.pid == process


@pytest.mark.skipif(not Path("/proc/self/task").is_dir(), reason="looks at processes as Linux shows them")
@pytest.mark.parametrize("busy", [False, True])
def test_ends_with_its_program(misbehaving, tmp_path, busy):
    """A program that is killed leaves no worker behind, neither an idle nor a busy one."""
    if busy:
        misbehaving.shall("block")
    settings = tmp_path / "settings.json"
    settings.write_text(json.dumps(misbehaving.settings(seconds=60)))
    code = (
        f"import json\nfrom uffuncs.calc.inside.worker_link import Worker\n"
        f"w = Worker(json.load(open({str(settings)!r})), {{}})\nprint(w.process.pid, flush=True)\n"
        + ("w.call('UF_VERSION', ())" if busy else "import time\ntime.sleep(60)")
    )
    program = subprocess.Popen(
        [sys.executable, "-c", code], stdout=subprocess.PIPE, text=True, cwd=Path(__file__).parents[2]
    )
    worker = int(program.stdout.readline())
    time.sleep(0.5)
    assert is_alive(worker)
    program.kill()
    program.wait()
    program.stdout.close()
    deadline = time.monotonic() + 20
    while is_alive(worker) and time.monotonic() < deadline:
        time.sleep(0.05)
    assert not is_alive(worker)


@pytest.fixture
def runner(tmp_path, monkeypatch):
    monkeypatch.setenv(configuration.OVERRIDE, str(tmp_path / "settings" / "calc.json"))
    monkeypatch.setattr(sys, "path", list(sys.path))
    found = Runner(SIGNATURES)
    yield found
    if isinstance(found.target, Worker):
        found.target.stop()


def test_without_settings(runner):
    assert error(runner.call(*DARCY)) == "#NAME?"
    reason = runner.call("UF_WHY", ("UF_FLUX_DARCY",))[0][0]
    assert "is missing; run: uffuncs install calc" in reason
    assert reason[len("uffuncs: ") :] in Path(configuration.problem_path()).read_text(encoding="utf-8")


@posix
@pytest.mark.parametrize(
    "python, told",
    [
        ("/nowhere/bin/python", "cannot be started"),
        ("/bin/false", "ended without a word"),
    ],
)
def test_a_python_that_is_gone(runner, python, told):
    configuration.write_configuration(own_settings() | {"python": python, "mode": configuration.WORKER})
    assert error(runner.call(*DARCY)) == "#NAME?"
    assert told in runner.call("UF_WHY", ())[0][0]


@posix
def test_a_python_without_the_library(runner, bare_python):
    configuration.write_configuration(own_settings() | {"python": bare_python, "paths": [], "mode": configuration.WORKER})
    assert "No module named 'uffuncs'" in runner.call("UF_WHY", ())[0][0]


@posix
def test_many_cells_do_not_try_again_at_once(runner, monkeypatch):
    configuration.write_configuration(own_settings() | {"python": "/bin/false", "mode": configuration.WORKER})
    runner.call(*DARCY)
    started = time.monotonic()
    assert {error(runner.call(*DARCY)) for _ in range(1000)} == {"#NAME?"}
    assert time.monotonic() - started < 10  # a try for each cell would take far longer
    monkeypatch.setattr(running, "RETRY", 0.0)
    runner.until = 0.0
    configuration.write_configuration(own_settings() | {"mode": configuration.WORKER})
    assert runner.call(*DARCY)[0][0] > 0


@posix
def test_a_python_that_vanishes(runner):
    configuration.write_configuration(own_settings() | {"mode": configuration.WORKER})
    assert runner.call(*DARCY)[0][0] > 0
    runner.target.configuration["python"] = "/bin/false"
    os.kill(runner.target.process.pid, signal.SIGKILL)
    started = time.monotonic()
    assert {error(runner.call(*DARCY)) for _ in range(1000)} == {"#NAME?"}
    assert time.monotonic() - started < 10  # a try for each cell would take far longer


@pytest.mark.parametrize("text", ["", "[]", "{}", '{"python": 3}', "no json"])
def test_settings_of_another_kind(runner, text):
    configuration.write_text(configuration.configuration_path(), text)
    assert "run: uffuncs install calc" in runner.call("UF_WHY", ())[0][0]


def test_functions_of_another_version_are_refused(tmp_path, monkeypatch):
    monkeypatch.setenv(configuration.OVERRIDE, str(tmp_path / "calc.json"))
    monkeypatch.setattr(sys, "path", list(sys.path))
    configuration.write_configuration(own_settings())
    older = SIGNATURES | {"UF_FLUX_DARCY": ["viscosity", "transmembrane_pressure"], "UF_GONE": []}
    assert set(stale(older)) == {"UF_FLUX_DARCY", "UF_GONE"}
    runner = Runner(older)
    assert error(runner.call(*DARCY)) == "#NAME?"
    assert runner.call("UF_VERSION", ()) == ((call("UF_VERSION", []),),)


IN_PROCESS = """
import json, sys, time
sys.path.insert(0, {inside!r})
from inside.running import InProcess, Runner
from inside.values import error_name
settings = json.load(open({settings!r}))
runner = Runner({{}})
runner.target = InProcess(settings, {{}})
first = runner.call("UF_VERSION", ())
open({demand!r}, "w").write({what!r})
started = time.monotonic()
hung = runner.call("UF_VERSION", ())
spent = time.monotonic() - started
import os
os.unlink({demand!r})
outcome = hung if isinstance(hung[0][0], str) else error_name(hung[0][0])
print(first, outcome, spent < 3, runner.call("UF_VERSION", ()))
"""


@pytest.mark.parametrize("what, outcome", [("spin", "#NUM!"), ("sleep", "#NUM!"), ("raise", "#VALUE!")])
def test_in_process(misbehaving, tmp_path, what, outcome):
    """The same limit without a worker: Python code that hangs is interrupted."""
    settings = tmp_path / "settings.json"
    settings.write_text(json.dumps(misbehaving.settings()))
    code = IN_PROCESS.format(
        inside=str(Path(inside.__file__).parents[1]),
        settings=str(settings),
        demand=str(misbehaving.demand),
        what=what,
    )
    done = subprocess.run([sys.executable, "-c", code], capture_output=True, text=True, timeout=60)
    assert done.stdout.strip() == f"(('well',),) {outcome} True (('well',),)", done.stderr


def test_in_process_only_where_it_fits(monkeypatch):
    settings = own_settings()
    assert running.fits(settings)
    assert not running.fits(settings | {"abi": "cpython-38-64"})
    assert not running.fits(
        settings | {"paths": []}
    )  # the NumPy that is loaded is not the one the settings name
