"""Time records of an invented one-pole board, written as instruments write them."""

from collections.abc import Callable

import numpy as np

from benchlog.curve import FloatArray

GAIN, CORNER_HZ = 48.0, 62.5e3
AMPLITUDE_V = 0.01


def board(frequency_hz: float) -> complex:
    """Return the board's gain."""
    return GAIN / (1 + 1j * frequency_hz / CORNER_HZ)


def samples(
    frequency_hz: float, *, count: int = 1000, cycles: float = 12.3, noise_rel: float = 1e-4
) -> tuple[FloatArray, FloatArray, FloatArray]:
    """Return times, input and output of a record; the noise has a fixed seed."""
    random = np.random.default_rng(int(frequency_hz))
    time_s = np.arange(count) * cycles / frequency_hz / count
    angle = 2 * np.pi * frequency_hz * time_s + 0.3
    gain = board(frequency_hz)
    before = AMPLITUDE_V * (np.cos(angle) + noise_rel * random.standard_normal(count))
    after = (
        AMPLITUDE_V
        * abs(gain)
        * (np.cos(angle + np.angle(gain)) + noise_rel * random.standard_normal(count))
    )
    return time_s, before, after + 0.2


Samples = tuple[FloatArray, FloatArray, FloatArray]


def plain(data: Samples) -> str:
    """One shared time column, units in brackets."""
    rows = (f"{t:.9e},{a:.7e},{b:.7e}\n" for t, a, b in zip(*data, strict=True))
    return "Time (s),Input (V),Output (V)\n" + "".join(rows)


def decimal_comma(data: Samples) -> str:
    """A ``sep=`` line, two header rows, microseconds and millivolts, decimal comma."""
    rows = (
        f"{1e6 * t:.6f};{1e3 * a:.6f};{b:.7f}\n".replace(".", ",")
        for t, a, b in zip(*data, strict=True)
    )
    return "sep=;\nInvented;;\nTime;Input;Output\n(us);(mV);(V)\n" + "".join(rows)


def interval_in_preamble(data: Samples) -> str:
    """No times: the sample interval stands above."""
    step_s = data[0][1] - data[0][0]
    rows = (f"{a:.7e},{b:.7e}\n" for a, b in zip(*data[1:], strict=True))
    head = f"Record length,{data[0].size}\nSample interval,{step_s:.12e},s\n\nInput,Output\nV,V\n"
    return head + "".join(rows)


def rate_in_preamble(data: Samples) -> str:
    """No times: the sample rate stands above, in kHz."""
    rate_khz = 1e-3 / (data[0][1] - data[0][0])
    rows = (f"{a:.7e}\t{b:.7e}\n" for a, b in zip(*data[1:], strict=True))
    return f"Sample rate (kHz)\t{rate_khz:.12e}\n\ninput\toutput\n" + "".join(rows)


def separate_times(data: Samples) -> str:
    """Each channel with its own time column."""
    rows = (f"{t:.9e},{a:.7e},{t:.9e},{b:.7e}\n" for t, a, b in zip(*data, strict=True))
    return "t1 (s),input (V),t2 (s),output (V)\n" + "".join(rows)


def codes(data: Samples) -> str:
    """Integer codes with scale and offset for each channel above."""
    step_s = data[0][1] - data[0][0]
    one, other = 1e-7, 1e-5
    rows = (
        f"{n},{round(a / one)},{round((b - 0.1) / other)}\n"
        for n, (a, b) in enumerate(zip(*data[1:], strict=True))
    )
    head = f"Time increment,{step_s:.12e}\nVertical scale,{one},{other}\nVertical offset,0,0.1\n"
    return head + "n,Input,Output\n" + "".join(rows)


def min_max_columns(data: Samples) -> str:
    """Lowest and highest value of each channel for each time."""
    rows = (
        f"{t:.9e},{a - 1e-6:.7e},{a + 1e-6:.7e},{b - 1e-5:.7e},{b + 1e-5:.7e}\n"
        for t, a, b in zip(*data, strict=True)
    )
    return "time (s),input min (V),input max (V),output min (V),output max (V)\n" + "".join(rows)


def rounded_times(data: Samples) -> str:
    """Time stamps with too few digits: many repeat."""
    step_s = data[0][1] - data[0][0]
    rows = (
        f"{np.floor(t / (3 * step_s)) * 3 * step_s:.9e},{a:.7e},{b:.7e}\n"
        for t, a, b in zip(*data, strict=True)
    )
    return "Time (s),Input (V),Output (V)\n" + "".join(rows)


DIALECTS: dict[str, Callable[[Samples], str]] = {
    write.__name__: write
    for write in (
        plain,
        decimal_comma,
        interval_in_preamble,
        rate_in_preamble,
        separate_times,
        codes,
        min_max_columns,
        rounded_times,
    )
}
