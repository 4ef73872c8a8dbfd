"""How starts, records, settings and factors are read, written back and described to an editor."""

from __future__ import annotations

import json
from fractions import Fraction
from typing import Any

import jsonschema
import pytest
from hypothesis import given, settings
from hypothesis import strategies as st

from atlas.config.settings import SettingsKind
from atlas.errors import ConfigRefused
from atlas.reading.orbit_kinds import NumbersKind, Record, RecordKind
from atlas.reading.place import Place
from atlas.reading.sheet_kinds import FactorKind
from atlas.reading.start_kinds import MOST_STARTS, StartsKind
from tiles.number import Exact, exact
from tiles.window import Axis

PLACE = Place("f.yaml", ("plates", "p", "key"))
STARTS, RECORD, SETTINGS = StartsKind(), RecordKind(), SettingsKind()
FACTOR, SIZES = FactorKind((1, 2, 4)), NumbersKind("state variables", above_zero=True)


def spread(grid: list[int], box: dict[str, list[Any]]) -> tuple[dict[str, Exact], ...]:
    return STARTS.read({"grid": grid, "box": box}, PLACE)


def slow_spread(grid: list[int], box: dict[str, list[Fraction]]) -> list[dict[str, Fraction]]:
    """Return the centres of the cells of a box, one name after the other, the last name fastest."""
    points: list[dict[str, Fraction]] = [{}]
    for (name, (low, high)), count in zip(box.items(), grid, strict=True):
        width = (high - low) / count
        points = [{**point, name: low + width * i + width / 2} for point in points for i in range(count)]
    return points


NAMES = st.lists(st.sampled_from(["x", "y", "z"]), min_size=1, max_size=3, unique=True)
ENDS = st.fractions(-5, 5, max_denominator=50)


class TestGrid:
    @settings(deadline=None)
    @given(st.data(), NAMES)
    def test_it_is_the_centres_of_cells_with_the_first_name_slowest(self, data: Any, names: list[str]):
        grid = [data.draw(st.integers(1, 6)) for _ in names]
        box = {name: sorted([low := data.draw(ENDS), low + data.draw(st.integers(1, 9))]) for name in names}
        found = spread(grid, {name: [str(end) for end in ends] for name, ends in box.items()})
        assert [{name: value.value for name, value in start.items()} for start in found] == slow_spread(
            grid, box
        )

    def test_its_centres_are_those_of_the_axis(self):
        starts = spread([7], {"x": ["0.1", "0.8"]})
        assert [float(start["x"]) for start in starts] == list(Axis.make(("x", "0.1", "0.8")).centres(7))

    def test_multiples_of_pi_stay_exact(self):
        assert [str(start["t"]) for start in spread([2], {"t": [0, "2*pi"]})] == ["1*pi/2", "3*pi/2"]
        assert [str(start["t"]) for start in spread([2], {"t": ["-pi", "pi"]})] == ["-1*pi/2", "1*pi/2"]
        assert [str(start["t"]) for start in spread([1], {"t": ["-pi", "pi"]})] == ["0"]

    def test_the_most_starts_are_read_and_one_more_is_not(self):
        assert len(spread([64, 64], {"x": [0, 1], "y": [0, 1]})) == MOST_STARTS
        with pytest.raises(
            ConfigRefused, match=r"grid: a grid of 17 x 241 has 4097 starts; at most 4096 are allowed"
        ):
            spread([17, 241], {"x": [0, 1], "y": [0, 1]})
        with pytest.raises(ConfigRefused, match="has 4611686018427387904 starts"):
            spread([1 << 31, 1 << 31], {"x": [0, 1], "y": [0, 1]})

    def test_it_is_written_as_the_list_that_it_comes_to(self):
        starts = spread([2, 2], {"y": [0, 1], "x": ["1/3", 1]})
        written = json.loads(json.dumps(STARTS.write(starts)))
        assert written[0] == {"x": "0.5", "y": "0.25"}
        assert STARTS.read(written, PLACE) == starts
        jsonschema.validate(written, STARTS.schema())


class TestRecord:
    @given(st.integers(1, 10**6), st.data())
    def test_what_is_written_is_read_back(self, every: int, data: Any):
        record = Record(every, data.draw(st.integers(0, every - 1)))
        assert RECORD.read(RECORD.write(record), PLACE) == record
        assert RECORD.read({"every": str(every), "phase": f"{record.phase}.0"}, PLACE) == record
        assert RECORD.read(record, PLACE) == record
        jsonschema.validate(RECORD.write(record), RECORD.schema())

    def test_the_phase_is_0_unless_given(self):
        assert RECORD.read({"every": 12}, PLACE) == Record(12, 0)

    @pytest.mark.parametrize(
        ("wrong", "words"),
        [
            ({"every": 12, "phase": 15}, "key.phase: the phase 15 is not below the stride 12; write 3"),
            ({"every": 12, "phase": -1}, "key.phase: '-1' is out of range"),
            ({"every": "1e7"}, "key.every: '1e7' is out of range; write a whole number from 1 to 1000000"),
            ({"phase": 1}, "key: the key 'every' is missing"),
            ([12, 3], "key: a list stands where a mapping of keys belongs"),
            (None, "key: nothing stands where a mapping of keys belongs"),
        ],
    )
    def test_what_is_no_record(self, wrong: Any, words: str):
        with pytest.raises(ConfigRefused) as caught:
            RECORD.read(wrong, PLACE)
        assert words in str(caught.value)


class TestSettings:
    def test_numbers_and_patterns_stand_side_by_side(self):
        given = {"r": {"pattern": ["a", " b ", "1/3", 2, 0.1]}, "h": "pi", "a": 0.1}
        found = SETTINGS.read(given, PLACE)
        entries = ("a", "b", exact("1/3"), exact(2), exact("0.1"))
        assert found == {"r": entries, "h": exact("pi"), "a": exact("0.1")}
        written = SETTINGS.write(found)
        assert list(written) == ["a", "h", "r"]
        assert SETTINGS.read(json.loads(json.dumps(written)), PLACE) == found
        jsonschema.validate(given, SETTINGS.schema())
        jsonschema.validate(written, SETTINGS.schema())

    @pytest.mark.parametrize(
        "wrong",
        [{"r": ["a"]}, {"r": None}, {"r": {}}, {"r": {"pattern": ["a b"]}}, {"r": {"pattern": "ab"}}, 3],
    )
    def test_what_is_no_setting(self, wrong: Any):
        with pytest.raises(ConfigRefused, match=r"^f\.yaml: plates\.p\.key"):
            SETTINGS.read(wrong, PLACE)


class TestOthers:
    def test_sizes_are_above_0(self):
        assert SIZES.read({"n": "1e-6"}, PLACE) == {"n": exact("1e-6")}
        for wrong in ("0", "-1", "-pi"):
            with pytest.raises(ConfigRefused, match=r"key\.n: .* is not above 0; write a number above 0"):
                SIZES.read({"n": wrong}, PLACE)
        assert NumbersKind("parameters").read({"n": "-1"}, PLACE) == {"n": exact(-1)}

    @pytest.mark.parametrize("given", [1, "2", 4.0])
    def test_factors_of_the_list_are_read(self, given: Any):
        assert FACTOR.read(given, PLACE) == int(float(given))
        jsonschema.validate(given, FACTOR.schema())

    @pytest.mark.parametrize("wrong", [3, "0", 8, "two", True, [2]])
    def test_other_factors_are_not(self, wrong: Any):
        with pytest.raises(ConfigRefused, match=r"plates\.p\.key: "):
            FACTOR.read(wrong, PLACE)
