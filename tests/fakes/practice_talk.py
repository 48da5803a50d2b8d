"""Short-hands to talk to one practice instrument in tests."""

from benchlog.practice.scpi import Instrument


def answer(instrument: Instrument, message: str, now_s: float = 0.0) -> str | None:
    """Return the text that a message is answered with, or None."""
    response = instrument.handle(message, now_s)
    return None if response is None else response.text


def errors(instrument: Instrument) -> list[int]:
    """Return and remove the numbers in the error queue."""
    numbers = []
    while (entry := answer(instrument, "SYST:ERR?")) != '0,"No error"':
        assert entry is not None
        numbers.append(int(entry.split(",")[0]))
    return numbers
