"""Settings for every test: hypothesis runs the same examples each time."""

from __future__ import annotations

from hypothesis import HealthCheck, settings

settings.register_profile(
    "fast",
    max_examples=40,
    deadline=None,
    derandomize=True,
    database=None,
    suppress_health_check=[HealthCheck.too_slow],
)
#: For a long search by hand: ``pytest --hypothesis-profile=search tests/laws``.
settings.register_profile("search", max_examples=2000, deadline=None, database=None)
settings.load_profile("fast")
