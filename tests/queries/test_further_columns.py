"""The list column of rare readings: the same places in Python and in SQL."""

from __future__ import annotations

import re

from meterlens.store.columns import FURTHER_COLUMNS
from meterlens.store.query_files import load_query


def test_places_agree() -> None:
    found = re.findall(
        r"further\[(\d+)\] as (\w+)", load_query("schema/view_00_reading_version").text
    )
    assert [(int(place), column) for place, column in found] == list(enumerate(FURTHER_COLUMNS, 1))
