"""Opening a link: late answers for others, pauses, and what is missing."""

import time
from collections.abc import Callable

import pytest

from benchlog.bench import link
from benchlog.bench.driver import LinkSettings
from benchlog.errors import LinkRefused
from tests.fakes.scpi_server import IDENTITY, ScpiServer, scpi_server


def late_first(instrument: ScpiServer, late: bytes) -> None:
    """Let an answer for whoever was here before come first."""

    def answer(_message: str) -> bytes:
        instrument.answers["*IDN?"] = IDENTITY
        return late + IDENTITY

    instrument.answers["*IDN?"] = answer


@pytest.mark.parametrize("late", [b"+1.25E-03\n", b'0,"No error"\n', b"1\n"])
def test_late_answer_for_another_is_no_identity(late: bytes) -> None:
    """And the first question is answered by its own answer."""
    with scpi_server(GOODq=b"1.25\n") as instrument:
        late_first(instrument, late)

        wire = link.open_link(instrument.address, timeout_s=0.3)

        assert wire.identity == IDENTITY.decode().strip()
        assert wire.ask("GOOD?", timeout_s=0.3) == "1.25"
        wire.close()


def test_short_identity_is_one_when_it_comes_twice() -> None:
    """Not all instruments give four fields."""
    with scpi_server() as instrument:
        instrument.answers["*IDN?"] = b"AC-1\n"
        wire = link.open_link(instrument.address, timeout_s=0.3)
        assert (wire.identity, instrument.asked) == ("AC-1", ["*IDN?", "*IDN?"])
        wire.close()


def test_pauses_that_an_instrument_needs() -> None:
    """Once after opening, and before each further message."""
    settings = LinkSettings(timeout_s=0.5, gap_s=0.06, after_open_s=0.08)
    with scpi_server(GOODq=b"1.25\n") as instrument:
        began_s = time.monotonic()
        wire = link.open_link(instrument.address, settings=settings)
        opened_s = time.monotonic()
        wire.send("A")
        wire.ask("GOOD?", timeout_s=0.5)
        asked_s = time.monotonic()
        wire.close()

    assert opened_s - began_s >= 0.08
    assert asked_s - opened_s >= 0.12


def refusing(error: Exception) -> Callable[[str], object]:
    """Return what stands in for the library's manager, and fails to open anything."""

    class Manager:
        def open_resource(self, *_: object, **__: object) -> None:
            raise error

    return lambda _backend: Manager()


@pytest.mark.parametrize(
    ("address", "extra"),
    [
        ("ASRL/dev/ttyUSB0::INSTR", "serial"),
        ("USB0::0x1234::0x5678::SN::INSTR", "usb"),
        ("GPIB::22", "gpib"),
    ],
)
def test_missing_package_is_named(
    address: str, extra: str, monkeypatch: pytest.MonkeyPatch
) -> None:
    """With the command that installs it, whatever is installed here."""
    error = ValueError("Please install something\nand more")
    monkeypatch.setattr(link, "_manager", refusing(error))
    with pytest.raises(LinkRefused) as refused:
        link.open_link(address)

    assert refused.value.what == "the link cannot be opened: Please install something"
    assert refused.value.hint == (
        f'install what this kind of link needs: pip install "benchlog[{extra}]"'
    )


def test_address_is_read_by_the_library_s_own_parser() -> None:
    """Before anything is opened; its message says what is missing."""
    with pytest.raises(LinkRefused) as refused:
        link.open_link("TCPIP::192.0.2.7::SOCKET")

    assert refused.value.what.startswith(
        "'TCPIP::192.0.2.7::SOCKET' is not the address of an instrument: "
    )
    assert refused.value.expected == 'a VISA resource name, like "TCPIP::192.0.2.7::5025::SOCKET"'


def test_unknown_host(monkeypatch: pytest.MonkeyPatch) -> None:
    """The library raises a bare exception then; a person gets the address and the reason."""
    error = Exception("could not connect: [Errno -2] Name or service not known")
    monkeypatch.setattr(link, "_manager", refusing(error))
    with pytest.raises(LinkRefused) as refused:
        link.open_link("TCPIP::no-such-host.invalid::5025::SOCKET")

    assert refused.value.where == "TCPIP::no-such-host.invalid::5025::SOCKET"
    assert "Name or service not known" in refused.value.what
    assert "check address" in str(refused.value.hint)
