"""The table: what drives the board, which board it is, and the dice."""

import threading
from dataclasses import dataclass, field

import numpy as np
import pytest

from benchlog.practice.world import (
    BOARDS_REMEMBERED,
    DRIVES_REMEMBERED,
    PERFECT,
    Bypass,
    Drive,
    Levels,
    Quality,
    World,
    normal_draw,
    uniform_draw,
)

ON = Drive(frequency_hz=1e3, emf_vrms=0.5, on=True)


@dataclass(slots=True)
class Tenfold:
    """A board that multiplies by ten, adds noise, and counts how often it is asked."""

    label: str = "tenfold"
    asked: list[float] = field(default_factory=list)

    def levels(self, frequency_hz: float, emf_vrms: float, *, source_ohm: float) -> Levels:
        """Multiply."""
        assert source_ohm == 50.0
        self.asked.append(frequency_hz)
        return Levels(input_vrms=emf_vrms, output_vrms=10 * emf_vrms, noise_vrms=0.3)


def test_empty_table_is_a_cable() -> None:
    """Without a board both meters see the source."""
    world = World(quality=PERFECT)
    world.set_drive(ON, 0.0)
    assert world.board_label == Bypass().label
    assert world.look("input", 1.0).level_vrms == world.look("output", 1.0).level_vrms == 0.5


def test_board_is_asked_once_for_each_drive() -> None:
    """Levels are kept until the board is taken away."""
    board = Tenfold()
    world = World(board, quality=PERFECT)
    world.set_drive(ON, 0.0)
    for _ in range(3):
        assert world.look("input", 1.0).level_vrms == 0.5
        assert world.look("output", 1.0).level_vrms == pytest.approx(np.hypot(5.0, 0.3))
    assert board.asked == [1e3]
    world.put_board(board)
    world.look("input", 1.0)
    assert board.asked == [1e3, 1e3]


def test_levels_kept_are_bounded() -> None:
    """A long sweep does not fill the memory."""
    board = Tenfold()
    world = World(board)
    for step in range(DRIVES_REMEMBERED + 1):
        world.set_drive(Drive(frequency_hz=1.0 + step, emf_vrms=0.5, on=True), 0.0)
        world.look("input", 1.0)
    world.set_drive(Drive(frequency_hz=1.0, emf_vrms=0.5, on=True), 0.0)
    world.look("input", 1.0)
    assert len(board.asked) == DRIVES_REMEMBERED + 2


def test_output_off_leaves_the_boards_noise() -> None:
    """The floor can be measured with the source off."""
    world = World(Tenfold())
    world.set_drive(Drive(emf_vrms=0.5, on=False), 0.0)
    assert world.look("output", 1.0).level_vrms == 0.3
    assert world.look("input", 1.0).level_vrms == 0.0


def test_source_has_an_error_of_its_own() -> None:
    """Every bench's source is a little off, always by the same, within its limit."""
    levels = []
    for seed in range(20):
        world = World(seed=seed)
        world.set_drive(ON, 0.0)
        levels.append(world.look("input", 1.0).level_vrms / 0.5 - 1)
        assert world.look("output", 2.0).level_vrms / 0.5 - 1 == levels[-1]
    assert len(set(levels)) == 20
    assert 0.5 < max(abs(level) for level in levels) / Quality().source_error_rel < 1.0


def test_time_since_a_change() -> None:
    """The same drive again is no change; another one, or a board put down now, is."""
    world = World(Tenfold())
    world.set_drive(ON, 10.0)
    world.set_drive(ON, 11.0)
    assert world.look("input", 12.0).since_change_s == 2.0
    world.put_board(Tenfold(), now_s=12.0)
    assert world.look("input", 12.5).since_change_s == 0.5
    world.put_board(Tenfold())
    assert world.look("input", 13.0).since_change_s == 1.0


def test_draws_depend_on_history_alone() -> None:
    """Two tables with the same history throw the same dice; any difference changes them."""

    def draws(seed: int, label: str) -> list[float]:
        world = World(Tenfold(label=label), seed=seed)
        world.set_drive(ON, 0.0)
        return [world.look(place, 1.0).draw for place in ("input", "output", "input")]

    first = draws(1, "a")
    assert draws(1, "a") == first
    assert len({*first, *draws(2, "a"), *draws(1, "b")}) == 9


def test_draws_go_on_counting_when_a_set_point_comes_back() -> None:
    """A second sweep of the same board is another sweep, as on a real bench."""
    world = World(Tenfold())
    world.set_drive(ON, 0.0)
    first = world.look("input", 1.0).draw
    world.set_drive(Drive(frequency_hz=2e3, emf_vrms=0.5, on=True), 2.0)
    world.look("input", 3.0)
    world.set_drive(ON, 4.0)
    second = world.look("input", 5.0).draw
    world.put_board(Tenfold(label="other"))
    world.put_board(Tenfold())
    assert len({first, second, world.look("input", 6.0).draw}) == 3


def test_counts_kept_are_bounded() -> None:
    """Long simulations forget boards that lay on the table long ago."""
    world = World(Tenfold(label="first"))
    before = world.look("input", 1.0).draw
    for number in range(BOARDS_REMEMBERED):
        world.put_board(Tenfold(label=str(number)))
        world.look("input", 1.0)
    world.put_board(Tenfold(label="first"))
    assert world.look("input", 1.0).draw == before


def test_normal_draws_are_normal() -> None:
    """Mean, spread and tails of 4,000 draws; bounds are four standard errors."""
    draws = np.array([normal_draw(7, count) for count in range(4000)])
    assert abs(draws.mean()) < 4 / np.sqrt(4000)
    assert abs(draws.std() - 1) < 4 / np.sqrt(8000)
    assert abs(np.mean(np.abs(draws) < 1.96) - 0.95) < 4 * np.sqrt(0.95 * 0.05 / 4000)


def test_uniform_draws_fill_their_band() -> None:
    """Between -1 and 1, mean 0, variance 1/3; bounds are four standard errors."""
    draws = np.array([uniform_draw(7, count) for count in range(4000)])
    assert -1 <= draws.min() < -0.99
    assert 0.99 < draws.max() < 1
    assert abs(draws.mean()) < 4 / np.sqrt(3 * 4000)
    assert abs(draws.var() - 1 / 3) < 4 * np.sqrt(4 / 45 / 4000)


def test_table_may_be_used_from_several_threads() -> None:
    """Readings from two threads are counted without loss."""
    world = World(Tenfold())
    world.set_drive(ON, 0.0)
    threads = [
        threading.Thread(target=lambda: [world.look("input", 1.0) for _ in range(500)])
        for _ in range(2)
    ]
    for thread in threads:
        thread.start()
    for thread in threads:
        thread.join()
    assert world.look("input", 1.0).draw == normal_draw(0, "tenfold", "input", ON, 1001)
