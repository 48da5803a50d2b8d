"""Every fault has a name, a sentence and the figures it takes."""

import pytest

from benchlog.extract.sentences import Seen, reasons_of
from benchlog.extract.validity import FIGURES_TAKEN, Fault
from benchlog.records import FIGURE_NAMES

SEEN = Seen(
    count=4, lowest_hz=10.0, highest_hz=1e6, corner_hz=62.5e3, past_corner=2, wild_hz=(1e3, 2e3)
)


@pytest.mark.parametrize("fault", [one for one in Fault if one])
def test_every_fault(fault: Fault) -> None:
    """One bit, one reason, one whole sentence without open fields."""
    reasons = reasons_of(int(fault), SEEN)
    assert len(reasons) == 1
    assert reasons[0].figures == FIGURES_TAKEN[fault]
    assert set(reasons[0].figures) <= set(FIGURE_NAMES)
    assert reasons[0].text[0].isupper()
    assert reasons[0].text.endswith(".")
    assert "{" not in reasons[0].text


def test_words_of_a_wild_point() -> None:
    """The sentence names the frequencies."""
    (reason,) = reasons_of(int(Fault.WILD_POINT), SEEN)
    assert reason.text == "Left out as wild, far from all the others: 1 kHz, 2 kHz."


def test_no_fault_no_reason() -> None:
    """A clean curve has none."""
    assert reasons_of(0, SEEN) == ()
