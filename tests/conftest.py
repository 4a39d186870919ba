"""Fixtures used across the tests: one invented engine, built once."""

from __future__ import annotations

import os

os.environ.setdefault("JUPYTER_PLATFORM_DIRS", "1")

import pytest
from hypothesis import HealthCheck, settings

import propkit as pk

settings.register_profile("propkit", deadline=None, max_examples=12, suppress_health_check=[HealthCheck.too_slow], derandomize=True)
settings.load_profile("propkit")


@pytest.fixture(scope="session")
def case() -> pk.PropellantCase:
    return pk.PropellantCase("LOX", "LCH4", mixture_ratio=3.4)


@pytest.fixture(scope="session")
def chamber(case: pk.PropellantCase) -> pk.Chamber:
    return pk.Chamber(case, pressure="9.7 MPa")


@pytest.fixture(scope="session")
def nozzle(chamber: pk.Chamber) -> pk.Nozzle:
    return pk.Nozzle(chamber, area_ratio=35, throat_diameter="0.18 m")


@pytest.fixture(scope="session")
def perf(nozzle: pk.Nozzle) -> pk.Performance:
    return pk.Performance(nozzle, ambient="sea level")
