"""The commands that every instrument has: IEEE 488.2's common ones and SCPI's required ones."""

from collections.abc import Callable, Sequence

from benchlog.practice.error_table import ScpiError
from benchlog.practice.parameters import Number, Value, as_float, nr1
from benchlog.practice.scpi import Command, Device, Handler, Moment
from benchlog.practice.status import LARGEST_SCPI_REGISTER, MASTER_BIT, Group, Status

SCPI_VERSION = "1999.0"

_REGISTER = (Number(words=()),)


def _identify(device: Device, _moment: Moment, _values: Sequence[Value]) -> str:
    return device.identity


def _reset(device: Device, moment: Moment, _values: Sequence[Value]) -> None:
    moment.status.complete_at(None)
    device.reset(moment.now_s)


def _clear(_device: Device, moment: Moment, _values: Sequence[Value]) -> None:
    moment.status.clear()


def _complete(device: Device, moment: Moment, _values: Sequence[Value]) -> None:
    moment.status.complete_at(device.busy_until_s)
    moment.status.catch_up(moment.now_s)


def _complete_query(device: Device, moment: Moment, _values: Sequence[Value]) -> str:
    moment.wait_until(device.busy_until_s)
    return "1"


def _wait(device: Device, moment: Moment, _values: Sequence[Value]) -> None:
    moment.wait_until(device.busy_until_s)
    moment.status.catch_up(moment.now_s)


def _events(_device: Device, moment: Moment, _values: Sequence[Value]) -> str:
    moment.status.catch_up(moment.now_s)
    return nr1(moment.status.take_events())


def _status_byte(_device: Device, moment: Moment, _values: Sequence[Value]) -> str:
    moment.status.catch_up(moment.now_s)
    return nr1(moment.status.byte(message_available=bool(moment.responses)))


def _self_test(_device: Device, _moment: Moment, _values: Sequence[Value]) -> str:
    return "0"


def _set_event_enable(_device: Device, moment: Moment, values: Sequence[Value]) -> None:
    moment.status.event_enable = _integer(values[0], 255)


def _event_enable(_device: Device, moment: Moment, _values: Sequence[Value]) -> str:
    return nr1(moment.status.event_enable)


def _set_service_enable(_device: Device, moment: Moment, values: Sequence[Value]) -> None:
    moment.status.service_enable = _integer(values[0], 255) & ~MASTER_BIT


def _service_enable(_device: Device, moment: Moment, _values: Sequence[Value]) -> str:
    return nr1(moment.status.service_enable)


def _next_error(_device: Device, moment: Moment, _values: Sequence[Value]) -> str:
    return moment.status.next_error()


def _all_errors(_device: Device, moment: Moment, _values: Sequence[Value]) -> str:
    return moment.status.all_errors()


def _error_count(_device: Device, moment: Moment, _values: Sequence[Value]) -> str:
    return nr1(moment.status.error_count())


def _version(_device: Device, _moment: Moment, _values: Sequence[Value]) -> str:
    return SCPI_VERSION


def _preset(_device: Device, moment: Moment, _values: Sequence[Value]) -> None:
    moment.status.questionable.enable = moment.status.operation.enable = 0


def _group_commands(name: str, pick: Callable[[Status], Group]) -> list[tuple[str, Command]]:
    def set_enable(_device: Device, moment: Moment, values: Sequence[Value]) -> None:
        pick(moment.status).enable = _integer(values[0], LARGEST_SCPI_REGISTER)

    def answer(read: Callable[[Group], int]) -> Handler:
        return lambda _device, moment, _values: nr1(read(pick(moment.status)))

    return [
        (f"STATus:{name}[:EVENt]?", Command(run=answer(Group.take_event))),
        (f"STATus:{name}:CONDition?", Command(run=answer(lambda group: group.condition))),
        (f"STATus:{name}:ENABle?", Command(run=answer(lambda group: group.enable))),
        (f"STATus:{name}:ENABle", Command(run=set_enable, parameters=_REGISTER, required=1)),
    ]


def _integer(value: Value, largest: int) -> int:
    number = round(min(max(as_float(value), -1.0), largest + 1.0))
    if not 0 <= number <= largest:
        raise ScpiError(-222)
    return number


COMMON_COMMANDS: tuple[tuple[str, Command], ...] = (
    ("*IDN?", Command(run=_identify, indefinite=True)),
    ("*RST", Command(run=_reset)),
    ("*CLS", Command(run=_clear)),
    ("*OPC", Command(run=_complete)),
    ("*OPC?", Command(run=_complete_query)),
    ("*WAI", Command(run=_wait)),
    ("*ESR?", Command(run=_events)),
    ("*STB?", Command(run=_status_byte)),
    ("*TST?", Command(run=_self_test)),
    ("*ESE", Command(run=_set_event_enable, parameters=_REGISTER, required=1)),
    ("*ESE?", Command(run=_event_enable)),
    ("*SRE", Command(run=_set_service_enable, parameters=_REGISTER, required=1)),
    ("*SRE?", Command(run=_service_enable)),
    ("SYSTem:ERRor[:NEXT]?", Command(run=_next_error)),
    ("SYSTem:ERRor:ALL?", Command(run=_all_errors)),
    ("SYSTem:ERRor:COUNt?", Command(run=_error_count)),
    ("SYSTem:VERSion?", Command(run=_version)),
    ("STATus:PRESet", Command(run=_preset)),
    *_group_commands("QUEStionable", lambda status: status.questionable),
    *_group_commands("OPERation", lambda status: status.operation),
)
