"""Hypothesis draws the same examples in every run of the suite: a red suite is never bad luck.

More examples, drawn anew: ``HYPOTHESIS_PROFILE=search python -m pytest tests/test_..._properties.py``.
"""

from __future__ import annotations

import os

from hypothesis import HealthCheck, settings

settings.register_profile("suite", derandomize=True, max_examples=50, deadline=None, database=None)
settings.register_profile(
    "search",
    deadline=None,
    max_examples=2000,
    database=None,
    suppress_health_check=[HealthCheck.too_slow],
)
settings.load_profile(os.environ.get("HYPOTHESIS_PROFILE", "suite"))
