"""Real time: waits are kept, and cut short when the work is to end."""

import threading

from benchlog.bench.clock import RealClock


def test_wait_takes_its_time() -> None:
    """Not less than asked for; nothing at all for none."""
    clock = RealClock()
    began_s = clock.now_s()
    clock.wait(0.05)
    assert 0.05 <= clock.now_s() - began_s < 1.0
    began_s = clock.now_s()
    clock.wait(0.0)
    clock.wait(-5.0)
    assert clock.now_s() - began_s < 0.05


def test_stop_cuts_a_wait_short() -> None:
    """Within a slice, from another thread or a signal handler."""
    stop = threading.Event()
    clock = RealClock(stop)
    threading.Timer(0.05, stop.set).start()
    began_s = clock.now_s()

    clock.wait(60.0)

    assert clock.now_s() - began_s < 1.0
    clock.wait(60.0)
    assert clock.now_s() - began_s < 1.0
