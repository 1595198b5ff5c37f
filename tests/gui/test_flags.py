"""Names of rules above the plot: they cross neither each other nor another's stem."""

import random

import pytest

from gui.plots.axes import plain, round_ticks
from gui.plots.flags import arrange


def crossings(stems, widths, places):
    found = []
    for i, (left, row) in enumerate(places):
        for j, (other, other_row) in enumerate(places):
            if i == j:
                continue
            if left < stems[j] < left + widths[i] and row <= other_row:
                found.append((i, j, "stem"))
            meet = left < other + widths[j] and other < left + widths[i]
            if meet and row == other_row:
                found.append((i, j, "text"))
    return found


def test_far_apart_all_stand_in_one_row():
    places = arrange([100.0, 300.0, 500.0], [60.0] * 3, 0.0, 800.0)
    assert [row for _, row in places] == [0, 0, 0]


def test_at_the_right_edge_the_name_stands_to_the_left():
    ((left, row),) = arrange([780.0], [60.0], 0.0, 800.0)
    assert (left, row) == (720.0, 0)


@pytest.mark.parametrize("seed", range(8))
def test_crowded_names_cross_nothing(seed):
    rng = random.Random(seed)
    count = 2 + seed
    stems = sorted(rng.uniform(50, 750) for _ in range(count))
    widths = [rng.uniform(40, 190) for _ in range(count)]
    assert crossings(stems, widths, arrange(stems, widths, 0.0, 800.0)) == []


@pytest.mark.parametrize(
    ("low", "high", "most", "ticks"),
    [
        (499.99999999999994, 1000.0000000000001, 8, ["500", "600", "700", "800", "900", "1000"]),
        (0.0, 46.8, 6, ["0", "10", "20", "30", "40"]),
        (0.0, 0.033, 5, ["0", "0.01", "0.02", "0.03"]),
        (-80.0, 120.0, 5, ["−50", "0", "50", "100"]),
    ],
)
def test_ticks_are_round_and_reach_the_ends(low, high, most, ticks):
    ((step, values),) = round_ticks(low, high, most)
    assert plain(values, step) == ticks
    assert all(low < v < high for v in values)
