"""From a bench file to an opened bench."""

import math
from collections.abc import Callable
from contextlib import ExitStack
from dataclasses import dataclass
from pathlib import Path
from typing import Literal, TypeAlias

from benchlog.bench.clock import RealClock, StopSign
from benchlog.bench.driver import Driver
from benchlog.bench.driver_read import read_driver
from benchlog.bench.faces import ClockFace
from benchlog.bench.lease import Lease
from benchlog.bench.link import open_link
from benchlog.bench.reply import parse_identity
from benchlog.bench.roles import Meter, Source, display_ratio
from benchlog.bench.setup_file import AttenuatorTable, BenchTables, MeterTable, SourceTable
from benchlog.bench.wire import Wire
from benchlog.errors import BenchFileError, IdentityError, QuantityError
from benchlog.quantity import decibel, level_vrms, ohm
from benchlog.records import InstrumentUsed, Term
from benchlog.sweep.limits import Band, BenchLimits
from benchlog.tables import FileKind

Role: TypeAlias = Literal["source", "input meter", "output meter"]

# What the practice bench calls its maker; nothing that says so may ever pass for a measurement.
PRACTICE_MAKER = "benchlog practice"
HIGH_IMPEDANCE = "high impedance"
_NEPER_DB = 20.0 / math.log(10.0)

KIND = FileKind(
    noun="bench file",
    struct=BenchTables,
    error=BenchFileError,
    example='name = "bench 2"',
    hint="`benchlog new DIR` makes one to start from",
)


@dataclass(frozen=True, slots=True, kw_only=True)
class Attenuator:
    """A fixed attenuator: level before over level behind it, and its uncertainty."""

    ratio: float = 1.0
    u_rel: float = 0.0
    before_input_meter: bool = True


@dataclass(frozen=True, slots=True, kw_only=True)
class Place:
    """One instrument of the bench file: where it is and how to talk to it."""

    role: Role
    address: str
    driver: Driver
    identity: str | None
    calibration_due: str | None


@dataclass(frozen=True, slots=True, kw_only=True)
class BenchSetup:
    """A bench as its file describes it, with quantities in the inner units.

    Attributes:
        text: The file as it was read.
        name, mains_hz: What the file says.
        logbook: Where sweeps are kept, relative paths counted from the bench file.
        max_level_vrms: Ceiling for the open-circuit level of the source.
        source, output_meter, input_meter: The instruments.
        source_ohm: Output resistance of the source.
        load_ohm: What the source's display is to count with; infinity is high impedance, None
            where the driver cannot set it.
        attenuator: Between source and board.
    """

    text: str
    name: str
    logbook: Path
    mains_hz: float
    max_level_vrms: float | None
    source: Place
    output_meter: Place
    input_meter: Place | None
    source_ohm: float
    load_ohm: float | None
    attenuator: Attenuator

    def places(self) -> tuple[Place, ...]:
        """Return the instruments, the source first."""
        present = (self.source, self.input_meter, self.output_meter)
        return tuple(place for place in present if place is not None)

    @property
    def display_ratio(self) -> float:
        """What the source's display shows over its open-circuit level."""
        return display_ratio(load_ohm=self.load_ohm, source_ohm=self.source_ohm)

    def limits(self) -> BenchLimits:
        """Return what a schedule is held against."""
        displayed = self.source.driver.level_range_vrms or (0.0, math.inf)
        low, high = (level / self.display_ratio for level in displayed)
        return BenchLimits(
            bands=tuple(
                Band(
                    name=place.role,
                    low_hz=place.driver.frequency_range_hz[0],
                    high_hz=place.driver.frequency_range_hz[1],
                )
                for place in self.places()
            ),
            source_low_vrms=low,
            source_high_vrms=high,
            max_level_vrms=self.max_level_vrms,
            attenuation=self.attenuator.ratio,
            meter_before_attenuator=not self.attenuator.before_input_meter,
        )

    def terms(self) -> tuple[Term, ...]:
        """Return the type B terms of a gain measured on this bench."""
        first = self.input_meter or self.source
        terms = (
            *self.output_meter.driver.terms(self.output_meter.role),
            *first.driver.terms(first.role),
        )
        in_gain = self.input_meter is None or not self.attenuator.before_input_meter
        if self.attenuator.u_rel > 0 and in_gain:
            loss = Term(
                name="attenuator", kind="scale", u_rel=self.attenuator.u_rel, source="bench file"
            )
            return (*terms, loss)
        return terms


class Bench:
    """An opened bench; a context manager that closes everything in reverse order."""

    def __init__(
        self,
        setup: BenchSetup,
        *,
        source: Source,
        output_meter: Meter,
        input_meter: Meter | None,
        clock: ClockFace,
        lease: Lease | None = None,
    ) -> None:
        self.setup = setup
        self.source = source
        self.output_meter = output_meter
        self.input_meter = input_meter
        self.clock = clock
        self._lease = lease

    def __enter__(self) -> "Bench":
        """Return the bench itself."""
        return self

    def __exit__(self, *_: object) -> None:
        """Close all links."""
        self.close()

    @property
    def simulated(self) -> bool:
        """True when any instrument says that it is a practice instrument."""
        roles = (self.source, self.input_meter, self.output_meter)
        identities = (role.identity for role in roles if role is not None)
        return any(parse_identity(identity)[0] == PRACTICE_MAKER for identity in identities)

    def instruments(self) -> tuple[InstrumentUsed, ...]:
        """Return the instruments as they are now, for the record of a sweep."""
        used = [_used(self.setup.source, self.source.identity)]
        if self.input_meter is not None and self.setup.input_meter is not None:
            used.append(_used(self.setup.input_meter, self.input_meter.identity))
        used.append(_used(self.setup.output_meter, self.output_meter.identity))
        return tuple(used)

    def close(self) -> None:
        """Close all links, the source last and whatever happens; twice is quiet."""
        with ExitStack() as closing:
            if self._lease is not None:
                closing.callback(self._lease.close)
            for role in (self.source, self.input_meter, self.output_meter):
                if role is not None:
                    closing.callback(role.close)


def read_bench(path: str | Path) -> BenchSetup:
    """Read a bench file.

    Raises:
        BenchFileError: It cannot be read, or what it says is wrong: file, key path, expectation.
        DriverFileError: A driver it names does not exist or is wrong.
    """
    content = KIND.content(path)
    text = KIND.text(content, where=str(path))
    try:
        return _setup(KIND.parse(text), text, folder=Path(path).parent)
    except QuantityError as error:
        raise BenchFileError(
            error.what, where=error.where, expected=error.expected, hint=error.hint
        ).at(str(path)) from error
    except BenchFileError as error:
        raise error.at(str(path)) from error


def open_bench(
    setup: BenchSetup,
    *,
    open_wire: Callable[[Place], Wire] | None = None,
    clock: ClockFace | None = None,
    stop: StopSign | None = None,
) -> Bench:
    """Open every instrument of a bench; whatever was opened is closed when one fails.

    Args:
        setup: The bench as its file describes it.
        open_wire: Opens one instrument; over the network, USB and so on by default.
        clock: What waits are made on; real time, watching ``stop``, by default.
        stop: Cuts waits short once it is set.

    Raises:
        LinkRefused: An instrument does not answer, or somebody else uses it.
        IdentityError: Another instrument answers than the bench file names.
    """
    opener = open_wire or _open_wire
    with ExitStack() as opened:
        lease = None
        if open_wire is None:
            lease = Lease(place.address for place in setup.places())
            opened.callback(lease.close)
        wires: dict[str, Wire] = {}
        for place in setup.places():
            wires[place.role] = _opened(opener, place, opened)
        opened.pop_all()
    input_place = setup.input_meter
    return Bench(
        setup,
        source=Source(
            wires[setup.source.role],
            setup.source.driver,
            load_ohm=setup.load_ohm,
            display_ratio=setup.display_ratio,
        ),
        output_meter=Meter(
            wires[setup.output_meter.role], setup.output_meter.driver, role=setup.output_meter.role
        ),
        input_meter=None
        if input_place is None
        else Meter(wires[input_place.role], input_place.driver, role=input_place.role),
        clock=clock or RealClock(stop),
        lease=lease,
    )


def _open_wire(place: Place) -> Wire:
    return open_link(place.address, settings=place.driver.link)


def _opened(opener: Callable[[Place], Wire], place: Place, opened: ExitStack) -> Wire:
    wire = opener(place)
    opened.callback(wire.close)
    if place.identity is not None and place.identity not in wire.identity:
        raise IdentityError(
            f"another instrument answers: {wire.identity!r}",
            where=f"{place.role} at {place.address}",
            expected=f"an identity with {place.identity!r} in it (identity in the bench file)",
            hint="check the address; if the instrument was exchanged, change the bench file",
        )
    return wire


def _setup(file: BenchTables, text: str, *, folder: Path) -> BenchSetup:
    source = file.source
    _check_addresses(file)
    source_place = _place(source, "source", wanted="source", folder=folder)
    return BenchSetup(
        text=text,
        name=file.name,
        logbook=folder / file.logbook,
        mains_hz=float(file.mains.split()[0]),
        max_level_vrms=None
        if file.max_level is None
        else level_vrms(file.max_level, field="max_level"),
        source=source_place,
        output_meter=_place(file.output_meter, "output meter", wanted="meter", folder=folder),
        input_meter=None
        if file.input_meter is None
        else _place(file.input_meter, "input meter", wanted="meter", folder=folder),
        source_ohm=ohm(source.impedance, field="source.impedance", zero_ok=True),
        load_ohm=_load_ohm(source, source_place.driver),
        attenuator=_attenuator(source),
    )


def _place(table: SourceTable | MeterTable, role: Role, *, wanted: str, folder: Path) -> Place:
    driver = read_driver(table.driver, folder=folder)
    key = role.replace(" ", "_")
    if driver.role != wanted:
        raise BenchFileError(
            f"the driver {table.driver!r} is for a {driver.role}",
            where=f"{key}.driver",
            expected=f"a driver for a {wanted}",
        )
    due = table.calibration_due
    return Place(
        role=role,
        address=table.address,
        driver=driver,
        identity=table.identity,
        calibration_due=None if due is None else due.isoformat(),
    )


def _load_ohm(source: SourceTable, driver: Driver) -> float | None:
    """Return what the display is to count with: high impedance where nothing else is said."""
    high = source.load in {None, HIGH_IMPEDANCE}
    wants = "set_high_impedance" if high else "set_load"
    if wants not in driver.messages:
        if source.load is None:
            return None
        raise BenchFileError(
            f"the driver {source.driver!r} cannot set this load",
            where="source.load",
            expected=f"no load, or a driver with a {wants} message",
        )
    return math.inf if high else ohm(str(source.load), field="source.load")


def _check_addresses(file: BenchTables) -> None:
    """Refuse two instruments at one address: their answers would be mixed up."""
    seen: dict[str, str] = {}
    tables = (
        ("source", file.source),
        ("output_meter", file.output_meter),
        ("input_meter", file.input_meter),
    )
    for key, table in tables:
        if table is None:
            continue
        other = seen.setdefault(table.address.casefold(), key)
        if other != key:
            raise BenchFileError(
                f"{key} and {other} have the same address",
                where=f"{key}.address",
                expected="one address for each instrument",
            )


def _attenuator(source: SourceTable) -> Attenuator:
    given = source.attenuator
    if given is None:
        return Attenuator()
    table = given if isinstance(given, AttenuatorTable) else AttenuatorTable(loss=given)
    field = "source.attenuator"
    loss_db = decibel(table.loss, field=f"{field}.loss")
    u_db = decibel(table.u, field=f"{field}.u")
    if loss_db < 0 or u_db < 0:
        raise BenchFileError(
            f"{field} has a negative loss or uncertainty",
            where=field,
            expected='a loss in decibels above zero, like "20 dB"',
        )
    return Attenuator(
        ratio=10.0 ** (loss_db / 20.0),
        u_rel=u_db / _NEPER_DB,
        before_input_meter=table.place == "before input meter",
    )


def _used(place: Place, identity: str) -> InstrumentUsed:
    return InstrumentUsed(
        role=place.role,
        identity=identity,
        address=place.address,
        driver=f"{place.driver.name} {place.driver.sha256[:12]}",
        calibration_due=place.calibration_due,
    )
