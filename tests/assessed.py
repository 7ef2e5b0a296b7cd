"""Assessments made once for all tests: a report is laid out in milliseconds, the engine behind it takes seconds."""

from __future__ import annotations

from functools import cache
from pathlib import Path

from benchtool.assessment import assess
from benchtool.case import Case
from benchtool.casefile import load
from benchtool.result import Assessment

SAMPLES = sorted(Path(__file__).parent.parent.joinpath("sample-cases").glob("*.toml"))


@cache
def assessed_once(case: Case) -> Assessment:
    """What `assess` says about the case, from memory the second time."""
    return assess(case)


def sample_path(name: str) -> Path:
    """The file of a sample case."""
    return next(path for path in SAMPLES if path.stem == name)


def assessed_sample(path: Path) -> Assessment:
    """The assessment of a sample case."""
    return assessed_once(load(path))
