"""The list column of rare readings: the same places in Python and in SQL."""

from __future__ import annotations

import re

import pytest

from meterlens.store.columns import FURTHER_COLUMNS
from meterlens.store.query_files import load_query


@pytest.mark.parametrize(
    "name", ["schema/view_0_interval", "ingest/stored_reading", "ingest/contested_version"]
)
def test_places_agree(name: str) -> None:
    found = re.findall(r"further\[(\d+)\] as (\w+)", load_query(name).text)
    assert [(int(place), column) for place, column in found] == list(enumerate(FURTHER_COLUMNS, 1))
