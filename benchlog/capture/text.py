"""From the bytes of a capture to its lines."""

from dataclasses import dataclass

from benchlog.errors import CaptureError

_MARKS = ((b"\xef\xbb\xbf", "utf-8"), (b"\xff\xfe", "utf-16-le"), (b"\xfe\xff", "utf-16-be"))
_SAMPLE_BYTES = 4096
# Text has hardly any of these; compressed or binary data has many.
_CONTROL = frozenset(range(32)) - {9, 10, 13, 26}
_MOST_CONTROL = 0.01


@dataclass(frozen=True, slots=True, kw_only=True)
class Text:
    """Decoded lines, numbered from 1 by their place, and the encoding that was found."""

    lines: tuple[str, ...]
    encoding: str


def decode(data: bytes) -> Text:
    """Find the encoding by its mark, by NUL bytes, by UTF-8's own grammar, else Latin-1.

    Args:
        data: The whole file.

    Raises:
        CaptureError: The file is empty, or it is not text.
    """
    if not data.strip(b"\x00\r\n\t \x1a"):
        raise CaptureError("the file is empty", expected="a table of numbers")
    encoding, body = _encoding(data)
    try:
        text = body.decode(encoding)
    except UnicodeDecodeError:
        if encoding.startswith("utf-16"):
            text = body.decode(encoding, errors="replace")
        else:
            encoding, text = "latin-1", body.decode("latin-1")
    # Ctrl-Z ended text files once, and some instruments still write it; others fill up with NULs.
    text = text.split("\x1a", 1)[0].rstrip("\x00")
    sample = text[:_SAMPLE_BYTES]
    if sum(ord(sign) in _CONTROL for sign in sample) > _MOST_CONTROL * len(sample):
        raise CaptureError(
            "the file is not text",
            expected="a table of numbers as text, such as CSV",
            hint="export it as CSV from the program that wrote it",
        )
    lines = text.replace("\r\n", "\n").replace("\r", "\n").split("\n")
    return Text(lines=tuple(lines), encoding=encoding)


def _encoding(data: bytes) -> tuple[str, bytes]:
    for mark, name in _MARKS:
        if data.startswith(mark):
            return name, data[len(mark) :]
    sample = data[:_SAMPLE_BYTES]
    even, odd = sample[0::2].count(0), sample[1::2].count(0)
    if max(even, odd) > 0.3 * len(sample) / 2 and min(even, odd) < 0.05 * len(sample) / 2:
        return ("utf-16-le" if odd > even else "utf-16-be"), data
    return "utf-8", data
