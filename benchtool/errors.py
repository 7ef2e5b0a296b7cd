"""The one exception tree, so that a caller catches `BenchtoolError` and the command line knows the exit status.

    BenchtoolError          1   something this tool can put into words
    ├─ QuantityError        3   a typed value that is not understood
    ├─ CaseError            3   a case or reading with problems, all of them at once
    └─ FileError            4   a file that cannot be read or written
"""

from __future__ import annotations

from collections.abc import Sequence
from dataclasses import dataclass


class BenchtoolError(Exception):
    """Base of every error that is told to the user in words instead of a traceback."""

    exit_status = 1


class QuantityError(BenchtoolError):
    """A typed value that is refused: what was found, and what is allowed in its place."""

    exit_status = 3

    def __init__(self, found: str, allowed: str) -> None:
        super().__init__(f"{found}: {allowed}")
        self.found = found
        self.allowed = allowed


@dataclass(frozen=True, slots=True)
class Problem:
    """One thing wrong in a case: where it stands, what was found and what is allowed there."""

    table: str
    key: str
    found: str
    allowed: str

    def __str__(self) -> str:
        where = " ".join(part for part in (self.table, self.key) if part)
        return f"{where}: found {self.found}; allowed: {self.allowed}"


class CaseError(BenchtoolError):
    """Every problem of one case file, in the order of the file."""

    exit_status = 3

    def __init__(self, name: str, problems: Sequence[Problem]) -> None:
        super().__init__("\n".join(f"{name}: {problem}" for problem in problems))
        self.name = name
        self.problems = tuple(problems)


class FileError(BenchtoolError):
    """A file that cannot be read or written: its name and the reason."""

    exit_status = 4

    def __init__(self, name: str, reason: str) -> None:
        super().__init__(f"{name}: {reason}")
        self.name = name
        self.reason = reason
