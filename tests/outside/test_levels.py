"""Published decibel and level conversions."""

import math

import pytest

from benchlog import notation, quantity


@pytest.mark.parametrize(
    ("dbm", "rms_50", "peak_50", "swing_50", "rms_75", "rms_600"),
    [
        # Table for a sine in 50 ohm (document 755204476, "Conversion of dBm to mW, Veff, Vp, Vpp"),
        # carried to more digits; the columns for 75 and 600 ohm are recomputed from P R.
        (-40, 0.002236, 0.003162, 0.006325, 0.002739, 0.007746),
        (-20, 0.022361, 0.031623, 0.063246, 0.027386, 0.077460),
        (0, 0.223607, 0.316228, 0.632456, 0.273861, 0.774597),
        (5, 0.397635, 0.562341, 1.124683, 0.487002, 1.377449),
        (10, 0.707107, 1.000000, 2.000000, 0.866025, 2.449490),
        (20, 2.236068, 3.162278, 6.324555, 2.738613, 7.745967),
        (30, 7.071068, 10.0, 20.0, 8.660254, 24.494897),
    ],
)
def test_power_into_a_load(
    dbm: float, rms_50: float, peak_50: float, swing_50: float, rms_75: float, rms_600: float
) -> None:
    """A level in dBm is the RMS voltage in its load, however the sine is described."""
    for load, rms in ((50, rms_50), (75, rms_75), (600, rms_600)):
        read = quantity.level_vrms(f"{dbm} dBm @ {load} ohm", field="level")
        assert read == pytest.approx(rms, abs=6e-7, rel=3e-4 if rms < 0.01 else 3e-6)
    same = [f"{peak_50} Vpk", f"{swing_50} Vpp", f"{rms_50} Vrms"]
    for text in same:
        assert quantity.level_vrms(text, field="level") == pytest.approx(rms_50, rel=3e-4)


@pytest.mark.parametrize(
    ("text", "vrms"),
    [
        # Line levels of studio and home equipment, common practice: +4 dBu and -10 dBV.
        ("+4 dBu", 1.227653),
        ("-10 dBV", 0.316228),
        # 0 dBu is 1 mW in 600 ohm.
        ("0 dBu", 0.774597),
        ("0 dBV", 1.0),
        # Peak to peak of a sine is 2.828427 times its RMS.
        ("2.828427 Vpp", 1.0),
        ("1.414214 Vpk", 1.0),
        ("20 mVpp", 0.00707107),
        ("100 mVrms", 0.1),
    ],
)
def test_levels_by_their_definitions(text: str, vrms: float) -> None:
    """Reference levels as defined."""
    assert quantity.level_vrms(text, field="level") == pytest.approx(vrms, rel=1e-6)


def test_studio_and_home_level_lie_11_8_db_apart() -> None:
    """+4 dBu over -10 dBV is 11.782 dB; common practice calls it 12."""
    studio = quantity.level_vrms("+4 dBu", field="level")
    home = quantity.level_vrms("-10 dBV", field="level")
    assert notation.decibels(studio / home) == pytest.approx(11.782, abs=5e-4)


@pytest.mark.parametrize(
    ("ratio", "decibels"),
    [
        # Definition: 20 log10 of the ratio, to four places.
        (0.1, -20.0),
        (0.5, -6.0206),
        (math.sqrt(0.5), -3.0103),
        (0.9, -0.9151),
        (0.99, -0.0873),
        (1.01, 0.0864),
        (1.1, 0.8279),
        (2, 6.0206),
        (10, 20.0),
    ],
)
def test_ratio_to_decibels(ratio: float, decibels: float) -> None:
    """Voltage ratios in decibels."""
    assert notation.decibels(ratio) == pytest.approx(decibels, abs=5e-5)


@pytest.mark.parametrize(
    ("text", "ratio"),
    [
        ("0.01 dB", 1.001152),
        ("0.1 dB", 1.011579),
        ("0.5 dB", 1.059254),
        ("1 dB", 1.122018),
        ("3 dB", 1.412538),
        ("6 dB", 1.995262),
    ],
)
def test_decibels_to_ratio(text: str, ratio: float) -> None:
    """Decibels as voltage ratios, by definition."""
    assert quantity.gain_ratio(text, field="gain") == pytest.approx(ratio, abs=5e-7)
