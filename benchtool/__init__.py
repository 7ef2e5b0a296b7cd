"""benchtool: bench diagnosis of mains supplies without a transformer. See README.md."""

from __future__ import annotations

from typing import TYPE_CHECKING

if TYPE_CHECKING:
    from benchtool.assessment import assess
    from benchtool.casefile import dump, dumps, load, loads
    from benchtool.errors import BenchtoolError

__version__ = "0.1.0"

__all__ = ["BenchtoolError", "__version__", "assess", "dump", "dumps", "load", "loads"]

_HOMES = {
    "BenchtoolError": "benchtool.errors",
    "assess": "benchtool.assessment",
    "dump": "benchtool.casefile",
    "dumps": "benchtool.casefile",
    "load": "benchtool.casefile",
    "loads": "benchtool.casefile",
}
"""Where each public name lives: imported when first asked for, so that `benchtool --help` loads no NumPy."""


def __getattr__(name: str) -> object:
    if name not in _HOMES:
        raise AttributeError(f"module {__name__!r} has no attribute {name!r}")
    from importlib import import_module

    return getattr(import_module(_HOMES[name]), name)


def __dir__() -> list[str]:
    return sorted({*globals(), *__all__})
