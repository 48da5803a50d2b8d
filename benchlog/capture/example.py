"""An invented capture, for the demo and the samples: a sixth board of the example design."""

import numpy as np

_GAIN, _CORNER_HZ = 47.8, 60.1e3
_LEVEL_VRMS = 7.071e-3
_SCATTER_REL, _SEED = 4e-4, 6


def example_capture() -> str:
    """Return a swept table as a bench in a country with decimal commas would write it."""
    frequency_hz = np.logspace(2, 6, 41)
    scatter = 1.0 + _SCATTER_REL * np.random.default_rng(_SEED).standard_normal(41)
    output_vrms = _LEVEL_VRMS * _GAIN / np.hypot(1.0, frequency_hz / _CORNER_HZ) * scatter
    rows = [
        f"{frequency:.6g};{1e3 * _LEVEL_VRMS:.4f};{1e3 * output:.4f}"
        for frequency, output in zip(frequency_hz, output_vrms, strict=True)
    ]
    head = ["Invented capture;;", "Board;sixth of the example design;"]
    names = "Frequency (Hz);Input (mVrms);Output (mVrms)"
    return "\n".join([*head, names, *(row.replace(".", ",") for row in rows), ""])
