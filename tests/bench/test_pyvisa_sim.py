"""The shipped drivers against a simulator that others wrote: strict, byte by byte."""

import math
import shutil
from collections.abc import Iterator
from pathlib import Path

import pytest

from benchlog.bench.driver_read import read_driver
from benchlog.bench.link import VisaWire, open_link
from benchlog.bench.roles import Meter, Source
from benchlog.errors import CommandRefused, LinkRefused, LinkTimeout
from benchlog.records import Reading, Status

SOURCE, METER, OVERLOADED = (f"TCPIP::192.0.2.{host}::5025::SOCKET" for host in (1, 2, 3))
DESCRIPTION = Path(__file__).parent / "foreign_bench.yaml"


@pytest.fixture
def backend(tmp_path: Path) -> str:
    """Return a backend of its own for each test: the simulator keeps what it was told."""
    shutil.copy(DESCRIPTION, tmp_path)
    return f"{tmp_path / DESCRIPTION.name}@sim"


def opened(address: str, backend: str, driver: str) -> VisaWire:
    """Open a link as the driver says."""
    settings = read_driver(driver).link
    return open_link(address, settings=settings, timeout_s=0.2, backend=backend)


@pytest.fixture
def wire(backend: str) -> Iterator[VisaWire]:
    """Yield a link to the source."""
    link = opened(SOURCE, backend, "source_generic")
    yield link
    link.close()


def told(wire: VisaWire) -> tuple[str, float, float]:
    """Return output, frequency and level as the simulated source has them."""
    frequency, level = (
        float(wire.ask(f"SOURce:{what}?", timeout_s=1.0)) for what in ("FREQuency", "VOLTage")
    )
    return wire.ask("OUTPut?", timeout_s=1.0), frequency, level


def test_source_takes_every_message(wire: VisaWire) -> None:
    """In the one spelling that the driver has, and with an empty error queue after each."""
    source = Source(wire, read_driver("source_generic"), load_ohm=math.inf)

    source.prepare()
    source.set_point(frequency_hz=62500.5, level_vrms=0.25)
    assert told(wire) == ("OFF", 62500.5, 0.25)
    source.switch_on()
    assert told(wire)[0] == "ON"
    source.check_errors()
    source.switch_off()
    assert told(wire)[0] == "OFF"
    assert source.identity == "Invented Works,SG-7,0017,2.1"
    source.close()


def test_display_that_counts_with_a_load_is_set_to_half(wire: VisaWire) -> None:
    """An open board gets what was asked for, not twice as much."""
    source = Source(wire, read_driver("source_generic"), load_ohm=50.0, display_ratio=0.5)

    source.prepare()
    source.set_point(frequency_hz=1e3, level_vrms=0.25)

    assert told(wire) == ("OFF", 1e3, 0.125)
    source.close()


def test_level_out_of_range_is_refused(wire: VisaWire) -> None:
    """The error queue says so, with number and text, and is empty afterwards."""
    source = Source(wire, read_driver("source_generic"))

    with pytest.raises(CommandRefused) as refused:
        source.set_point(frequency_hz=1e3, level_vrms=8.5)

    assert "SOURce:VOLTage 8.5" in refused.value.what
    assert '-113,"Undefined header"' in refused.value.what
    assert refused.value.where == f"source at {SOURCE}"
    source.check_errors()
    source.set_point(frequency_hz=1e3, level_vrms=1.5)
    source.close()


@pytest.mark.parametrize(
    ("address", "value_vrms", "status"),
    [(METER, 0.339411255, Status.OK), (OVERLOADED, None, Status.OVERLOAD)],
)
def test_meter_reads(backend: str, address: str, value_vrms: float | None, status: Status) -> None:
    """A number, or a state; the reply is kept as it came."""
    link = opened(address, backend, "meter_generic")
    meter = Meter(link, read_driver("meter_generic"), role="output meter")

    meter.prepare()
    reading = meter.read_level(frequency_hz=1e3)

    raw = "+3.39411255E-01" if status is Status.OK else "+9.90000000E+37"
    assert reading == Reading(value_vrms=value_vrms, status=status, raw=raw)
    meter.check_errors()
    meter.close()


def test_recovery_without_device_clear(wire: VisaWire) -> None:
    """The simulator knows no clear; draining and identifying do."""
    with pytest.raises(LinkTimeout):
        wire.ask("NEVER?", timeout_s=0.05)

    wire.recover()

    assert wire.ask("OUTPut?", timeout_s=1.0) == "OFF"


def test_recovery_clears_where_the_transport_can(
    wire: VisaWire, monkeypatch: pytest.MonkeyPatch
) -> None:
    """A device clear belongs to USB, GPIB and the like; a socket has none."""
    cleared: list[bool] = []
    monkeypatch.setattr(
        wire._transport._resource, "clear", lambda: cleared.append(True), raising=True
    )
    wire.recover()

    assert cleared == [True]


def test_address_where_nothing_is(backend: str) -> None:
    """Refused at opening."""
    with pytest.raises(LinkRefused):
        opened("TCPIP::192.0.2.9::5025::SOCKET", backend, "source_generic")
