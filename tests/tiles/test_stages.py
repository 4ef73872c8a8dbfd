"""Every level pair of a tile set is built once, from something finer that is there."""

import pytest
from hypothesis import given
from hypothesis import strategies as some

from tiles.grid import level_pairs
from tiles.stages import stages

LEVEL = some.integers(0, 12)


@given(
    LEVEL, LEVEL, some.one_of(some.sampled_from(["diagonal", "all"]), some.lists(some.tuples(LEVEL, LEVEL)))
)
def test_stages_build_every_pair_once(across, up, pairs):
    if not isinstance(pairs, str):
        pairs = [(min(a, across), min(u, up)) for a, u in pairs]
    wanted = level_pairs(across, up, pairs)
    built = []
    for stage in stages(wanted):
        assert stage.first == (not built)
        assert stage.leaf == (across, up) if stage.first else stage.leaf in built
        assert stage.top == min(stage.ups)
        for a, ups in stage.ups.items():
            assert a <= stage.leaf[0] if stage.first else a < stage.leaf[0]
            assert all(u <= stage.leaf[1] for u in ups)
            built.extend((a, u) for u in ups)
    assert sorted(built) == list(wanted)


def test_enough_tasks_are_left_for_several_workers():
    for across in range(4, 12):
        first = next(iter(stages(level_pairs(across, across))))
        assert 2**first.top >= 16


@pytest.mark.parametrize(("across", "up"), [(6, 10), (8, 12)])
def test_a_task_of_a_tall_view_returns_one_tile_column(across, up):
    first = next(iter(stages(level_pairs(across, up))))
    assert first.top == across


def test_each_stage_starts_from_the_coarsest_pair_that_is_fine_enough():
    pairs = level_pairs(6, 6, [(6, 4), (5, 5), (5, 2), (3, 3)])
    assert [stage.leaf for stage in stages(pairs)] == [(6, 6), (5, 5)]
