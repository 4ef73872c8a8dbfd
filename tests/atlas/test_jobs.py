"""Records: their normalised form, from which they are made again, and the digests that tell them apart."""

from __future__ import annotations

import copy
import json
from fractions import Fraction
from pathlib import Path
from typing import Any

import pytest
from hypothesis import given, settings
from hypothesis import strategies as st

from atlas.config.keys import FORMATS, SECTIONS
from atlas.config.load import counting_digest, digest, normalised, parse_config, plate_from_parts
from atlas.config.remake import from_normalised
from atlas.errors import ConfigRefused
from atlas.reading.yaml_text import read_yaml
from tiles.palette import PALETTES

SOUND = Path(__file__).with_name("sound.yaml").read_text(encoding="utf-8")
TREE: Any = read_yaml(SOUND, "sound.yaml")


DRAWN_ONLY: list[tuple[str, Any]] = [
    ("title", "Stock"),
    ("palette", "blue"),
    ("background", "white"),
    ("shading", "ink"),
    ("dpi", "300"),
    ("size", "90x60"),
    ("formats", ["svg"]),
    ("key", "true"),
    ("letter", "b"),
    ("across", {"name": "r", "low": "1.6", "high": "4.2", "label": "growth"}),
]
COUNTED: list[tuple[str, Any]] = [
    ("across", ["r", "1.6", "4.3"]),
    ("up", ["n", 0, 3]),
    ("up", {"name": "n", "low": "0.01", "high": "3.5", "scale": "log"}),
    ("set", {"h": "0.11"}),
    ("starts", [{"n": 1}]),
    ("transient", 7),
    ("transient_limit", 10**7),
    ("samples", 9),
    ("values_per_column", 5),
    ("longest_period", 3),
]


def sound() -> dict[str, Any]:
    return copy.deepcopy(TREE)


class TestDigests:
    def test_every_key_of_the_table_is_a_field_of_its_record(self):
        config = parse_config(SOUND)
        for section, record in zip(
            SECTIONS,
            (config.plates["growth"], config.tile_sets["tiles"], config.figures["both"]),
            strict=True,
        ):
            assert set(normalised(record)["settings"]) == {key.name for key in SECTIONS[section]}

    def test_the_record_is_made_again_from_its_normalised_form(self):
        for record in parse_config(SOUND).outputs().values():
            form = json.loads(json.dumps(normalised(record)))
            again = from_normalised(form)
            assert again == record
            assert normalised(again) == form

    @pytest.mark.parametrize("wrong", [{}, {"kind": "plate"}, {"kind": [], "name": 1, "settings": 3}])
    def test_what_is_no_normalised_form_is_refused(self, wrong: dict[str, Any]):
        with pytest.raises(ConfigRefused, match=r"^record: "):
            from_normalised(wrong)

    def test_the_way_of_writing_does_not_matter(self):
        tree = sound()
        tree["plates"]["growth"].update(
            across={"high": "42e-1", "low": "8/5", "name": "r"}, transient="2e3", starts=[{"n": "3/10"}]
        )
        tree["defaults"] = {"formats": ["png", "pdf"], "dpi": "600.0"}
        assert digest(parse_config(tree).plates["growth"]) == digest(parse_config(SOUND).plates["growth"])

    @pytest.mark.parametrize(
        ("key", "value"),
        DRAWN_ONLY,
    )
    def test_what_is_only_drawn_changes_the_digest_but_not_that_of_the_counts(self, key: str, value: Any):
        tree = sound()
        tree["plates"]["growth"][key] = value
        before, after = parse_config(SOUND).plates["growth"], parse_config(tree).plates["growth"]
        assert digest(before) != digest(after)
        assert counting_digest(before, 100, 50) == counting_digest(after, 100, 50)

    @pytest.mark.parametrize(
        ("key", "value"),
        COUNTED,
    )
    def test_what_is_counted_changes_both(self, key: str, value: Any):
        tree = sound()
        del tree["plates"]["growth"]["inset"]
        before = parse_config(tree).plates["growth"]
        tree["plates"]["growth"][key] = value
        after = parse_config(tree).plates["growth"]
        assert digest(before) != digest(after)
        assert counting_digest(before, 100, 50) != counting_digest(after, 100, 50)

    def test_the_resolution_and_the_samples_belong_to_the_counts(self):
        plate = parse_config(SOUND).plates["growth"]
        forms = {
            counting_digest(plate, 100, 50),
            counting_digest(plate, 101, 50),
            counting_digest(plate, 100, 51),
            counting_digest(plate, 100, 50, samples=9),
        }
        assert len(forms) == 4

    def test_title_path_and_labels_do_not_belong_to_the_counts(self):
        tree = sound()
        tree["title"] = "Another"
        tree["families"]["sound"]["state"]["n"].update(label="biomass", unit="t")
        tree["families"]["sound"]["parameters"]["h"]["default"] = "0.3"
        before, after = parse_config(SOUND), parse_config(tree)
        for one, two in zip(
            [before.plates["growth"], before.tile_sets["tiles"]],
            [after.plates["growth"], after.tile_sets["tiles"]],
            strict=True,
        ):
            assert digest(one) != digest(two)
        assert counting_digest(before.plates["growth"], 9, 9) == counting_digest(after.plates["growth"], 9, 9)
        assert counting_digest(before.tile_sets["tiles"], 9, 9) != counting_digest(
            after.tile_sets["tiles"], 9, 9
        )

    def test_the_mathematics_of_the_family_belongs_to_the_counts(self):
        tree = sound()
        tree["families"]["sound"]["step"]["n"] = "s * exp(r * (1 - n))"
        before, after = parse_config(SOUND).plates["growth"], parse_config(tree).plates["growth"]
        assert counting_digest(before, 9, 9) != counting_digest(after, 9, 9)

    @settings(deadline=None, max_examples=50)
    @given(
        size=st.sampled_from(["90x60", "1000x500px", "85.5x60.25"]),
        formats=st.lists(st.sampled_from(sorted(FORMATS)), min_size=1, unique=True),
        palette=st.sampled_from([name for name, row in PALETTES.items() if row.kind == "sequential"]),
        low=st.fractions(Fraction(1, 100), 2, max_denominator=997),
        width=st.floats(0.001, 2),
        font=st.floats(3, 72),
        samples=st.integers(1, 10**9) | st.just("auto"),
        label=st.none()
        | st.text(st.characters(codec="utf-8", categories=["L", "N"]), min_size=1, max_size=9),
    )
    def test_any_valid_plate_is_made_again_from_its_normalised_form(
        self, size, formats, palette, low, width, font, samples, label
    ):
        plate = plate_from_parts(
            "logistic",
            {"name": "r", "low": low, "high": low + Fraction(width)} | ({"label": label} if label else {}),
            ("x", 0, 1),
            size=size,
            formats=formats,
            palette=palette,
            font_size=font,
            samples=samples,
        )
        again = from_normalised(json.loads(json.dumps(normalised(plate))))
        assert again == plate
        assert digest(again) == digest(plate)
