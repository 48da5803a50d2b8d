"""Signals become a flag, then an interrupt."""

import os
import signal
import threading

import pytest

from benchlog.bench.runner import run_sweep
from benchlog.bench.stop import StopFlag, stop_on_signals
from benchlog.errors import ExitCode
from benchlog.records import Point
from benchlog.sweep.schedule import log_spaced, spaced_schedule
from tests.fakes.fake_bench import FakeBench

SCHEDULE = spaced_schedule(log_spaced(100.0, 1e6, 2), 0.01)
posix = pytest.mark.skipif(os.name != "posix", reason="signals of POSIX systems")


def test_the_first_reason_stays() -> None:
    """Whoever stops first is named; a later reason does not hide it."""
    flag = StopFlag()
    assert not flag.is_set()

    flag.set("first", exit_code=7)
    flag.set("second")

    assert flag.is_set()
    assert (flag.why, flag.exit_code) == ("first", 7)


@posix
@pytest.mark.parametrize(
    ("name", "why", "exit_code"),
    [
        ("SIGINT", "The sweep was stopped by Ctrl-C.", ExitCode.STOPPED),
        ("SIGTERM", "The sweep was stopped by the system (SIGTERM).", ExitCode.TERMINATED),
        ("SIGHUP", "The sweep was stopped by the system (SIGHUP).", ExitCode.STOPPED),
    ],
)
def test_a_signal_sets_the_flag(name: str, why: str, exit_code: int) -> None:
    """The first signal is only noted, with its exit code; the handlers come back at the end."""
    number = signal.Signals[name]
    before = signal.getsignal(number)

    with stop_on_signals() as flag:
        os.kill(os.getpid(), number)
        assert (flag.why, flag.exit_code) == (why, exit_code)

    assert signal.getsignal(number) is before


@posix
@pytest.mark.parametrize("second", ["SIGINT", "SIGTERM"])
def test_the_second_signal_interrupts(second: str) -> None:
    """Who presses twice does not want to wait for the reading."""
    with stop_on_signals() as flag:
        os.kill(os.getpid(), signal.SIGINT)
        with pytest.raises(KeyboardInterrupt):
            os.kill(os.getpid(), signal.Signals[second])
    assert flag.why == "The sweep was stopped by Ctrl-C."


@posix
@pytest.mark.parametrize(("name", "exit_code"), [("SIGINT", 130), ("SIGTERM", 143)])
def test_a_signal_interrupts_a_question(name: str, exit_code: int) -> None:
    """Where a person is asked and nothing runs, one press is enough; afterwards not."""
    with stop_on_signals() as flag:
        with pytest.raises(KeyboardInterrupt), flag.asking():
            os.kill(os.getpid(), signal.Signals[name])
        assert (flag.is_set(), flag.exit_code) == (True, exit_code)

    with stop_on_signals() as flag:
        with flag.asking():
            pass
        os.kill(os.getpid(), signal.SIGINT)
        assert flag.is_set()


def test_outside_the_main_thread_the_flag_works_without_signals() -> None:
    """Handlers belong to the main thread; another one gets a plain flag."""
    before = signal.getsignal(signal.SIGINT)
    seen: list[bool] = []

    def work() -> None:
        with stop_on_signals() as flag:
            seen.append(signal.getsignal(signal.SIGINT) is before)
            flag.set("enough")
            seen.append(flag.is_set())

    thread = threading.Thread(target=work)
    thread.start()
    thread.join()

    assert seen == [True, True]


@posix
@pytest.mark.parametrize(("presses", "readings"), [(1, 1), (2, 0)])
def test_ctrl_c_in_a_reading(presses: int, readings: int) -> None:
    """One press lets the reading end; two do not; the source is off and kept points are right."""
    bench, kept = FakeBench(), list[Point]()
    done: list[str] = []

    def press(name: str) -> None:
        if name == "input_meter.read_level" and bench.calls.count(name) == 3:
            for _ in range(presses):
                os.kill(os.getpid(), signal.SIGINT)
            done.append(name)

    bench.on_call = press
    with stop_on_signals() as stop:
        result = run_sweep(bench, SCHEDULE, keep=kept.append, stop=stop)

    assert (result.state, len(kept), len(done)) == ("stopped", 2, readings)
    assert bench.calls[-1] == "source.switch_off"
    assert not bench.knobs.on
