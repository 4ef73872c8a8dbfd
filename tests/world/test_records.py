"""The published values say where they come from."""

from __future__ import annotations

import pytest

from tests.reference.published import ids, published


@pytest.mark.parametrize("name", ids(""))
def test_a_record_names_its_source_and_how_it_was_verified(name: str) -> None:
    record = published(name)
    assert record.source
    assert record.tolerance
    assert record.how_verified
    assert record.source_citation in ("n/a", "looked up", "from memory", "memory")
    known = record.source.startswith(("exact algebra", "common practice, no source"))
    assert known or any(mark.isdigit() for mark in record.source)  # a year


def test_numbers_are_read_exactly_as_printed() -> None:
    assert published("log.pd.2").number() * 10**21 == 3449489742783178098197
