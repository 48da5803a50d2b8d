"""The standard's error numbers and their texts, and the error that a parser raises.

Source:
    SCPI-99, volume 2, 21.8: numbers and texts as seen in a public transcription, recorded with
    the published checks of this project.  Texts repeat, so the number is the key.
"""

QUEUE_OVERFLOW = -350
QUERY_INTERRUPTED = -410
QUERY_UNTERMINATED = -420
QUERY_AFTER_INDEFINITE = -440

ERROR_TEXTS = {
    0: "No error",
    -100: "Command error",
    -101: "Invalid character",
    -102: "Syntax error",
    -103: "Invalid separator",
    -104: "Data type error",
    -105: "GET not allowed",
    -108: "Parameter not allowed",
    -109: "Missing parameter",
    -110: "Command header error",
    -111: "Header separator error",
    -112: "Program mnemonic too long",
    -113: "Undefined header",
    -114: "Header suffix out of range",
    -115: "Unexpected number of parameters",
    -120: "Numeric data error",
    -121: "Invalid character in number",
    -123: "Exponent too large",
    -124: "Too many digits",
    -128: "Numeric data not allowed",
    -130: "Suffix error",
    -131: "Invalid suffix",
    -134: "Suffix too long",
    -138: "Suffix not allowed",
    -140: "Character data error",
    -141: "Invalid character data",
    -144: "Character data too long",
    -148: "Character data not allowed",
    -150: "String data error",
    -151: "Invalid string data",
    -158: "String data not allowed",
    -160: "Block data error",
    -161: "Invalid block data",
    -168: "Block data not allowed",
    -170: "Expression error",
    -171: "Invalid expression",
    -178: "Expression data not allowed",
    -200: "Execution error",
    -203: "Command protected",
    -210: "Trigger error",
    -211: "Trigger ignored",
    -213: "Init ignored",
    -214: "Trigger deadlock",
    -220: "Parameter error",
    -221: "Settings conflict",
    -222: "Data out of range",
    -223: "Too much data",
    -224: "Illegal parameter value",
    -230: "Data corrupt or stale",
    -231: "Data questionable",
    -240: "Hardware error",
    -241: "Hardware missing",
    -300: "Device-specific error",
    -310: "System error",
    -311: "Memory error",
    -330: "Self-test failed",
    -340: "Calibration failed",
    -350: "Queue overflow",
    -360: "Communication error",
    -363: "Input buffer overrun",
    -365: "Time out error",
    -400: "Query error",
    -410: "Query INTERRUPTED",
    -420: "Query UNTERMINATED",
    -430: "Query DEADLOCKED",
    -440: "Query UNTERMINATED after indefinite response",
    -500: "Power on",
    -600: "User request",
    -700: "Request control",
    -800: "Operation complete",
}

# First digit of a negative number -> bit of the standard event status register.
_EVENT_BITS = {1: 32, 2: 16, 3: 8, 4: 4, 5: 128, 6: 64, 7: 2, 8: 1}


class ScpiError(Exception):
    """A program message unit is wrong; ``number`` goes into the error queue."""

    def __init__(self, number: int) -> None:
        super().__init__(f'{number},"{ERROR_TEXTS[number]}"')
        self.number = number

    @property
    def ends_message(self) -> bool:
        """Tell whether the rest of the program message is given up (command errors)."""
        return -199 <= self.number <= -100


def error_entry(number: int) -> str:
    """Return a queue entry as ``SYSTem:ERRor?`` answers it: ``-113,"Undefined header"``."""
    return f'{number},"{ERROR_TEXTS[number]}"'


def event_bit(number: int) -> int:
    """Return the weight that an error sets in the standard event status register.

    Source:
        SCPI-99, volume 2, 21.8: the class of an error selects the bit.
    """
    return _EVENT_BITS[-number // 100] if number < 0 else 8
