"""From a bench file to an opened bench, and shut again."""

import math
from collections.abc import Callable, Iterator
from contextlib import ExitStack
from pathlib import Path

import pytest

from benchlog.bench.clock import RealClock
from benchlog.bench.link import open_link
from benchlog.bench.setup import Attenuator, BenchSetup, Place, open_bench, read_bench
from benchlog.bench.wire import Wire
from benchlog.errors import IdentityError, LinkRefused
from benchlog.folders import data_folder
from benchlog.records import InstrumentUsed
from tests.fakes.scpi_server import ScpiServer, scpi_server

WHOLE = """\
name = "bench 2"
logbook = "logs/logbook.db"
mains = "60 Hz"
max_level = "2 Vpp"

[source]
driver = "source_generic"
address = "TCPIP::192.0.2.1::5025::SOCKET"
identity = "SG-7"
impedance = "50 ohm"
load = "high impedance"
attenuator = { loss = "20 dB", u = "0.05 dB", place = "after input meter" }
calibration_due = 2027-03-31

[output_meter]
driver = "meter_generic"
address = "TCPIP::192.0.2.2::5025::SOCKET"
calibration_due = 2027-04-30

[input_meter]
driver = "meter_generic"
address = "TCPIP::192.0.2.3::5025::SOCKET"
"""
SHORT = """\
name = "bench 1"
[source]
driver = "source_generic"
address = "TCPIP::192.0.2.1::5025::SOCKET"
[output_meter]
driver = "meter_generic"
address = "TCPIP::192.0.2.2::5025::SOCKET"
"""
Reader = Callable[..., BenchSetup]


@pytest.fixture
def read(tmp_path: Path) -> Reader:
    """Return a function that writes a bench file, with texts replaced, and reads it."""

    def written_and_read(text: str, *changes: tuple[str, str]) -> BenchSetup:
        for old, new in changes:
            assert text.count(old) == 1, old
            text = text.replace(old, new)
        path = tmp_path / "bench.toml"
        path.write_text(text, encoding="utf-8")
        return read_bench(path)

    return written_and_read


def test_every_key_of_a_bench_file(read: Reader, tmp_path: Path) -> None:
    """Quantities in the inner units; the logbook beside the bench file."""
    setup = read(WHOLE)

    assert (setup.name, setup.mains_hz, setup.source_ohm) == ("bench 2", 60.0, 50.0)
    assert setup.logbook == tmp_path / "logs" / "logbook.db"
    assert setup.max_level_vrms == pytest.approx(2 / math.sqrt(8))
    assert [place.role for place in setup.places()] == ["source", "input meter", "output meter"]
    assert setup.source.identity == "SG-7"
    assert setup.source.calibration_due == "2027-03-31"
    assert setup.attenuator.ratio == pytest.approx(10.0)
    assert setup.attenuator.u_rel == pytest.approx(0.0057565, rel=1e-4)
    assert not setup.attenuator.before_input_meter
    assert setup.text == WHOLE


def test_what_is_not_said(read: Reader, tmp_path: Path) -> None:
    """No meter at the input, no attenuator, no ceiling; the display shows the open output."""
    setup = read(SHORT)

    assert (setup.input_meter, setup.max_level_vrms) == (None, None)
    assert setup.attenuator == Attenuator()
    assert setup.logbook == tmp_path / "logbook.db"
    assert (setup.load_ohm, setup.display_ratio) == (math.inf, 1.0)


def test_driver_that_cannot_set_a_load(read: Reader, tmp_path: Path) -> None:
    """Its display is taken as it is."""
    text = (data_folder("drivers") / "source_generic.toml").read_text(encoding="utf-8")
    head, tail = text.split("[message.set_load]")
    path = tmp_path / "plain.toml"
    path.write_text(head + tail[tail.index("[message.set_point]") :], encoding="utf-8")

    assert read(SHORT, ("source_generic", "plain.toml")).load_ohm is None


@pytest.mark.parametrize("given", ['"20 dB"', '{ loss = "20 dB" }'])
def test_attenuator_given_shortly(read: Reader, given: str) -> None:
    """A loss alone is exact and stands before the input meter."""
    setup = read(SHORT, ("[output_meter]", f"attenuator = {given}\n[output_meter]"))

    assert setup.attenuator.ratio == pytest.approx(10.0)
    assert (setup.attenuator.u_rel, setup.attenuator.before_input_meter) == (0.0, True)


def test_limits_of_the_bench(read: Reader) -> None:
    """Bands of all instruments; what the source can be set to."""
    limits = read(WHOLE).limits()

    assert [(band.name, band.low_hz, band.high_hz) for band in limits.bands] == [
        ("source", 1.0, 2e7),
        ("input meter", 10.0, 1e7),
        ("output meter", 10.0, 1e7),
    ]
    assert (limits.source_low_vrms, limits.source_high_vrms) == (1e-4, 7.0)
    assert limits.attenuation == pytest.approx(10.0)
    assert limits.meter_before_attenuator


def test_display_that_counts_with_a_load(read: Reader) -> None:
    """An open output gives twice what the display shows at 50 ohm and 50 ohm."""
    setup = read(SHORT, ("[output_meter]", 'load = "50 ohm"\n[output_meter]'))

    assert (setup.load_ohm, setup.display_ratio) == (50.0, 0.5)
    assert setup.limits().source_high_vrms == 14.0
    assert read(SHORT, ("[output_meter]", 'load = "1k"\n[output_meter]')).display_ratio == (
        pytest.approx(1000 / 1050)
    )


def test_terms_of_a_gain(read: Reader) -> None:
    """Both meters; the attenuator where it is part of the gain; the source where nobody reads."""
    between, before = read(WHOLE), read(WHOLE, (', place = "after input meter"', ""))
    alone = read(SHORT)

    assert [term.name for term in between.terms()] == [
        "output meter accuracy",
        "output meter flatness",
        "input meter accuracy",
        "input meter flatness",
        "attenuator",
    ]
    assert between.terms()[-1].u_rel == pytest.approx(0.0057565, rel=1e-4)
    assert "attenuator" not in [term.name for term in before.terms()]
    assert [term.name for term in alone.terms()][2:] == ["source accuracy", "source flatness"]


ANSWERS: dict[str, bytes | Callable[[str], bytes | None] | None] = {
    "OUTPut OFF": None,
    "*OPC?": b"1\n",
    "SYSTem:ERRor?": b'0,"No error"\n',
}


@pytest.fixture
def servers() -> Iterator[list[ScpiServer]]:
    """Yield three instruments that agree to everything."""
    with ExitStack() as stack:
        running = [stack.enter_context(scpi_server()) for _ in range(3)]
        for server in running:
            server.answers |= ANSWERS
        yield running


def on(servers: list[ScpiServer], text: str = WHOLE) -> str:
    """Return a bench file with the addresses of running instruments."""
    text = text.replace('identity = "SG-7"\n', "")
    for host, server in enumerate(servers, start=1):
        text = text.replace(f"TCPIP::192.0.2.{host}::5025::SOCKET", server.address)
    return text


def test_bench_opens_and_closes(read: Reader, servers: list[ScpiServer]) -> None:
    """Every instrument identified; the source switched off at the end; closing twice is quiet."""
    with open_bench(read(on(servers))) as bench:
        assert [server.asked for server in servers] == [["*IDN?"]] * 3
        assert isinstance(bench.clock, RealClock)
        assert not bench.simulated
        assert bench.instruments()[0] == InstrumentUsed(
            role="source",
            identity="Invented Works,AC-1,0042,1.0",
            address=servers[0].address,
            driver=f"source_generic {bench.source.driver.sha256[:12]}",
            calibration_due="2027-03-31",
        )
        assert [used.role for used in bench.instruments()] == [
            "source",
            "input meter",
            "output meter",
        ]
    assert servers[0].asked == ["*IDN?", "OUTPut OFF", "*OPC?"]
    bench.close()
    assert servers[0].asked == ["*IDN?", "OUTPut OFF", "*OPC?"]


def test_practice_instruments_say_so(read: Reader, servers: list[ScpiServer]) -> None:
    """One is enough, whatever the bench file says."""
    servers[1].answers["*IDN?"] = b"benchlog practice,AC meter,1,1\n"
    with open_bench(read(on(servers))) as bench:
        assert bench.simulated


def wires_of(opened: list[Wire]) -> Callable[[Place], Wire]:
    """Return an opener that notes what it opened."""

    def opener(place: Place) -> Wire:
        opened.append(open_link(place.address, settings=place.driver.link, timeout_s=0.2))
        return opened[-1]

    return opener


def test_one_that_does_not_answer_closes_the_others(
    read: Reader, servers: list[ScpiServer]
) -> None:
    """Nothing stays open behind an error."""
    servers[1].answers["*IDN?"] = None
    opened: list[Wire] = []

    with pytest.raises(LinkRefused) as refused:
        open_bench(read(on(servers)), open_wire=wires_of(opened))

    assert refused.value.where == servers[1].address
    assert len(opened) == 2
    for wire in opened:
        with pytest.raises(RuntimeError, match="is closed"):
            wire.send("*CLS")


def test_another_instrument_than_the_file_names(read: Reader, servers: list[ScpiServer]) -> None:
    """Told with role, address, and what the file says; everything is closed."""
    text = on(servers).replace("[input_meter]\n", '[input_meter]\nidentity = "AC-9"\n')
    opened: list[Wire] = []

    with pytest.raises(IdentityError) as other:
        open_bench(read(text), open_wire=wires_of(opened))

    assert other.value.where == f"input meter at {servers[2].address}"
    assert "'AC-9'" in str(other.value.expected)
    with pytest.raises(RuntimeError, match="is closed"):
        opened[-1].send("*CLS")


def test_trouble_in_closing_one_closes_the_others(
    read: Reader, servers: list[ScpiServer], monkeypatch: pytest.MonkeyPatch
) -> None:
    """An interrupt while the first is closed leaves none of them open, and the source off."""
    bench = open_bench(read(on(servers)))

    def interrupted() -> None:
        raise KeyboardInterrupt

    monkeypatch.setattr(bench.output_meter, "close", interrupted)
    with pytest.raises(KeyboardInterrupt):
        bench.close()

    assert servers[0].asked[-2:] == ["OUTPut OFF", "*OPC?"]
    monkeypatch.undo()
    bench.output_meter.close()


def test_source_is_closed_last(
    read: Reader, servers: list[ScpiServer], monkeypatch: pytest.MonkeyPatch
) -> None:
    """In the reverse order of opening."""
    closed: list[str] = []
    with open_bench(read(on(servers))) as bench:
        for name in ("source", "input_meter", "output_meter"):
            role = getattr(bench, name)

            def close(name: str = name, really: Callable[[], None] = role.close) -> None:
                closed.append(name)
                really()

            monkeypatch.setattr(role, "close", close)

    assert closed == ["output_meter", "input_meter", "source"]


def test_waits_end_when_the_work_is_to_end(read: Reader, servers: list[ScpiServer]) -> None:
    """The bench's clock looks at the stop sign."""

    class Set:
        def is_set(self) -> bool:
            return True

    with open_bench(read(on(servers)), stop=Set()) as bench:
        began_s = bench.clock.now_s()
        bench.clock.wait(60.0)
        assert bench.clock.now_s() - began_s < 5.0
