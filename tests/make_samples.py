"""Write the files of ``sample_data/``; all of it is invented, and ORIGIN.md says how.

python tests/make_samples.py
"""

import sys
from pathlib import Path

ROOT = Path(__file__).parents[1]
if __name__ == "__main__":
    sys.path.insert(0, str(ROOT))

from benchlog.capture.example import example_capture  # noqa: E402 - the path comes first
from benchlog.cli.new import bench_text  # noqa: E402
from benchlog.design.example import EXAMPLE_DESIGN  # noqa: E402
from tests.fakes.records import DIALECTS, samples  # noqa: E402

FREQUENCIES_HZ = (200.0, 1e3, 5e3, 2e4, 4e4, 6e4, 1e5, 2e5, 4e5, 8e5)


def sample_files() -> dict[str, str]:
    """Return the text of each sample by its path below ``sample_data/``."""
    dialects = [DIALECTS[name] for name in ("plain", "decimal_comma", "interval_in_preamble")]
    records = {
        f"captures/board_0042/{int(frequency_hz):06d}_hz.csv": dialects[place % 3](
            samples(frequency_hz, count=400)
        )
        for place, frequency_hz in enumerate(FREQUENCIES_HZ)
    }
    return {
        "line_preamp.toml": EXAMPLE_DESIGN,
        "bench.toml": bench_text(),
        "captures/table_0006.csv": example_capture(),
        **records,
    }


def main() -> None:
    """Write them all."""
    for name, text in sample_files().items():
        path = ROOT / "sample_data" / name
        path.parent.mkdir(parents=True, exist_ok=True)
        path.write_text(text, encoding="utf-8", newline="\n")


if __name__ == "__main__":
    main()
