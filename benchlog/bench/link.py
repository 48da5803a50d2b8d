"""Links to real instruments: the one file that knows pyvisa.

Open means identified.  A link that may hold half an exchange is dirty and takes nothing but
``recover`` and ``close``.  Seconds outside, milliseconds only here.
"""

import select
import socket
import time
from collections.abc import Iterator
from contextlib import contextmanager, suppress
from functools import cache
from typing import Any, cast

import pyvisa
from pyvisa.constants import StatusCode
from pyvisa.resources import MessageBasedResource
from pyvisa.rname import InvalidResourceName, ResourceName

from benchlog.bench.driver import LinkSettings
from benchlog.bench.recover import identify, recover_link
from benchlog.bench.reply import parse_identity
from benchlog.errors import (
    BenchlogError,
    LinkLost,
    LinkRefused,
    LinkTimeout,
    Misuse,
    ReplyError,
)

BACKEND = "@py"
_QUIET_S = 0.05
# A flood that never ends must not keep a recovery going for ever.
_MOST_DRAINED = 1000
_PEEKED_BYTES = 4096
_PADDING = "\r\n\0 "
_LOST = {
    StatusCode.error_connection_lost,
    StatusCode.error_invalid_object,
    StatusCode.error_system_error,
}


def open_link(
    address: str,
    *,
    settings: LinkSettings | None = None,
    timeout_s: float | None = None,
    backend: str = BACKEND,
) -> "VisaWire":
    """Open a link and let the instrument identify itself.

    Args:
        address: A VISA resource name, ``TCPIP::192.0.2.7::5025::SOCKET``.
        settings: Terminators and default timeout, from the driver.
        timeout_s: How long the instrument may take to answer ``*IDN?``.
        backend: Which VISA implementation pyvisa is to use.

    Returns:
        The link; close it.

    Raises:
        LinkRefused: The address is malformed, nothing is there, or what is there does not
            identify itself.
    """
    rules = settings or LinkSettings()
    _check_address(address)
    transport = _Transport(address, rules, backend)
    try:
        transport.open(timeout_s or rules.timeout_s)
        identity = identify(transport, timeout_s=timeout_s or rules.timeout_s)
        parse_identity(identity)
    except (LinkTimeout, LinkLost, ReplyError) as error:
        transport.close()
        raise LinkRefused(
            f"the instrument did not identify itself: {error.what}",
            where=address,
            expected="an answer to *IDN?",
            hint="check that it is switched on, the cable, the address, and that nobody else "
            "holds it",
        ) from error
    except BaseException:
        transport.close()
        raise
    return VisaWire(transport, identity, timeout_s=timeout_s or rules.timeout_s)


class VisaWire:
    """A link over pyvisa; see ``benchlog.bench.wire.Wire``. Made by ``open_link``."""

    def __init__(self, transport: "_Transport", identity: str, *, timeout_s: float) -> None:
        self.address = transport.address
        self.identity = identity
        self.dirty = False
        self._transport = transport
        self._timeout_s = timeout_s
        self._closed = False

    def send(self, message: str) -> None:
        """Send a message that has no answer."""
        with self._exchange(message):
            self._transport.send(message, self._timeout_s)

    def ask(self, message: str, *, timeout_s: float) -> str:
        """Send a message whose last line is a query, and return the answer."""
        with self._exchange(message):
            return self._transport.ask(message, timeout_s)

    def recover(self) -> None:
        """Make the link clean, reopening it if need be."""
        if self._closed:
            raise Misuse(f"the link to {self.address} is closed")
        self.dirty = True
        recover_link(self._transport, self.identity, timeout_s=self._timeout_s)
        self.dirty = False

    def close(self) -> None:
        """Close the link; twice is quiet."""
        self._closed = True
        self._transport.close()

    @contextmanager
    def _exchange(self, message: str) -> Iterator[None]:
        if not message.isascii():
            raise Misuse(f"only ASCII can be sent to an instrument, not {message!r}")
        if self._closed:
            raise Misuse(f"the link to {self.address} is closed")
        if self.dirty:
            raise Misuse(f"the link to {self.address} is dirty: recover it first")
        # Set before anything moves: an interrupt at any moment must find it set.
        self.dirty = True
        self._check_in_step()
        yield
        self._check_in_step()
        self.dirty = False

    def _check_in_step(self) -> None:
        """Refuse to go on with more answers than questions: one of them would be the wrong one."""
        unasked = self._transport.unread()
        if unasked.strip(_PADDING):
            raise ReplyError(
                "an answer came that nobody asked for: the instrument is out of step",
                where=self.address,
                raw=unasked,
                expected="one answer to each question",
                hint="if it happens again, look for a second program on the same instrument",
            )


class _Transport:
    """Text over one pyvisa resource, with foreign errors turned into ours."""

    def __init__(self, address: str, settings: LinkSettings, backend: str) -> None:
        self.address = address
        self._settings = settings
        self._backend = backend
        self._resource: MessageBasedResource | None = None
        self._free_at_s = 0.0

    def open(self, timeout_s: float) -> None:
        """Open or reopen; says nothing yet about whether anybody is there."""
        self.close()
        try:
            resource = _manager(self._backend).open_resource(
                self.address,
                open_timeout=_milliseconds(timeout_s),
                read_termination=self._settings.read_terminator,
                write_termination=self._settings.write_terminator,
                timeout=_milliseconds(timeout_s),
            )
        # pyvisa-py raises bare exceptions of many kinds here, for unknown hosts among others.
        except Exception as error:
            raise LinkRefused(
                f"the link cannot be opened: {_first_line(error)}",
                where=self.address,
                hint=_opening_hint(self.address, error),
            ) from error
        self._resource = cast("MessageBasedResource", resource)
        time.sleep(self._settings.after_open_s)

    def send(self, message: str, timeout_s: float) -> None:
        """Write a whole message in one go: separate writes wait for each other on a network."""
        end = self._settings.write_terminator
        data = (message.replace("\n", end) + end).encode("ascii")
        time.sleep(max(0.0, self._free_at_s - time.monotonic()))
        with self._translated(message, timeout_s) as resource:
            resource.timeout = _milliseconds(timeout_s)
            resource.write_raw(data)
        self._free_at_s = time.monotonic() + self._settings.gap_s

    def ask(self, message: str, timeout_s: float) -> str:
        """Write a message and read one answer."""
        self.send(message, timeout_s)
        return self.read(message, timeout_s)

    def read(self, asked: str, timeout_s: float) -> str:
        """Read one answer, without terminator and padding."""
        with self._translated(asked, timeout_s) as resource:
            resource.timeout = _milliseconds(timeout_s)
            answer = bytes(resource.read_raw()).decode("latin-1").strip(_PADDING)
        self._free_at_s = time.monotonic() + self._settings.gap_s
        return answer

    def drain(self) -> None:
        """Clear the instrument where its transport can, then read until nothing more comes."""
        if self._resource is None:
            return
        # pyvisa-py's clear of a socket only reads, and reads for ever once the far end has closed.
        if self._socket() is None:
            # Simulators and some transports know no device clear.
            with suppress(Exception):
                self._resource.clear()
        for _ in range(_MOST_DRAINED):
            try:
                self.read("", _QUIET_S)
            except LinkTimeout:
                return

    def close(self) -> None:
        """Close the resource; whatever a dying link says about it is no longer of interest."""
        if self._resource is not None:
            with suppress(Exception):
                self._resource.close()
            self._resource = None

    @contextmanager
    def _translated(self, message: str, timeout_s: float) -> Iterator[MessageBasedResource]:
        if self._resource is None:
            raise LinkLost("the link is not open", where=self.address)
        began_s = time.monotonic()
        try:
            yield self._resource
        except BenchlogError:
            raise
        except pyvisa.VisaIOError as error:
            if self._peer_is_gone():
                raise self._lost(message, "it closed the connection") from error
            if error.error_code in _LOST or error.error_code != StatusCode.error_timeout:
                raise self._lost(message, _first_line(error)) from error
            raise LinkTimeout(
                f"no answer to {message!r} within {time.monotonic() - began_s:.2g} s",
                where=self.address,
                expected=f"an answer within {timeout_s:g} s",
                hint="check whether the instrument is busy, in local mode, or in a menu",
            ) from error
        except (pyvisa.Error, OSError, ValueError) as error:
            raise self._lost(message, _first_line(error)) from error

    def _lost(self, message: str, why: str) -> LinkLost:
        return LinkLost(
            f"the instrument went away at {message!r}: {why}",
            where=self.address,
            hint="check its power and its cable",
        )

    def unread(self) -> str:
        """Return what has arrived and was not read; empty where the transport cannot tell."""
        pending = bytes(getattr(self._session(), "_pending_buffer", b""))
        return (pending + (self._peeked() or b"")).decode("latin-1")

    def _peer_is_gone(self) -> bool:
        """Look whether the far end closed: pyvisa-py reports that as a timeout."""
        return self._peeked() == b""

    def _peeked(self) -> bytes | None:
        """Look at what a socket holds: nothing is None, the end of the stream is empty bytes."""
        wire = self._socket()
        if wire is None:
            return None
        try:
            ready, _, _ = select.select([wire], [], [], 0.0)
            return wire.recv(_PEEKED_BYTES, socket.MSG_PEEK) if ready else None
        except OSError:
            return b""

    def _socket(self) -> socket.socket | None:
        """Return the socket beneath, where there is one."""
        wire = getattr(self._session(), "interface", None)
        return wire if isinstance(wire, socket.socket) else None

    def _session(self) -> object:
        """Return pyvisa-py's own session object; other backends have none."""
        if self._resource is None:
            return None
        library = cast("Any", self._resource).visalib
        return getattr(library, "sessions", {}).get(cast("Any", self._resource).session)


@cache
def _manager(backend: str) -> pyvisa.ResourceManager:
    """Return the one manager of a backend: closing any of them would close every link."""
    return pyvisa.ResourceManager(backend)


def _check_address(address: str) -> None:
    try:
        ResourceName.from_string(address)
    except InvalidResourceName as error:
        raise LinkRefused(
            f"{address!r} is not the address of an instrument: {_first_line(error)}",
            where="address",
            expected='a VISA resource name, like "TCPIP::192.0.2.7::5025::SOCKET"',
        ) from error


def _opening_hint(address: str, error: Exception) -> str:
    """Tell a missing package from a missing instrument."""
    kinds = (("ASRL", "serial"), ("USB", "usb"), ("GPIB", "gpib"))
    extra = next((extra for kind, extra in kinds if address.upper().startswith(kind)), None)
    if extra is not None and isinstance(error, ValueError):
        return f'install what this kind of link needs: pip install "benchlog[{extra}]"'
    return "check address, power and cable; `benchlog bench check` says more"


def _milliseconds(seconds: float) -> int:
    return max(1, round(seconds * 1000.0))


def _first_line(error: Exception) -> str:
    lines = str(error).strip().splitlines()
    return lines[0].rstrip(".") if lines else type(error).__name__
