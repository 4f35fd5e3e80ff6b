"""Shared fixtures, and the hypothesis profiles: dev (quick), ci, review (a reviewer's thorough run)."""

import os

import pytest
from hypothesis import HealthCheck, settings

settings.register_profile("dev", max_examples=40, deadline=None)
settings.register_profile(
    "ci", max_examples=100, deadline=None, derandomize=True, print_blob=True, database=None
)
settings.register_profile(
    "review", max_examples=5000, deadline=None, print_blob=True, suppress_health_check=[HealthCheck.too_slow]
)
settings.load_profile(os.environ.get("HYPOTHESIS_PROFILE", "ci" if os.environ.get("CI") else "dev"))


@pytest.fixture(scope="session")
def registry():
    from strikeenergy.registry import load

    found = load()
    assert not found.failures
    return found
