"""How long `--help` lets a bench wait, as a multiple of starting Python at all; also run as a test."""

from __future__ import annotations

import statistics
import subprocess
import sys
import time

RUNS = 7
ALLOWED = 8.0
HEAVY = ("numpy", "pint", "rich", "tomlkit", "scipy", "textual")
COMMANDS = {
    "python": [sys.executable, "-c", "pass"],
    "help": [sys.executable, "-m", "benchtool", "--help"],
}


def seconds(command: list[str]) -> float:
    started = time.perf_counter()
    subprocess.run(command, check=True, stdout=subprocess.DEVNULL)
    return time.perf_counter() - started


def medians() -> dict[str, float]:
    """Median start of both, interleaved so that a busy machine slows both alike [s]."""
    taken: dict[str, list[float]] = {name: [] for name in COMMANDS}
    for _ in range(RUNS):
        for name, command in COMMANDS.items():
            taken[name].append(seconds(command))
    return {name: statistics.median(values) for name, values in taken.items()}


def test_help_starts_within_a_few_bare_starts_of_python() -> None:
    found = medians()
    print(", ".join(f"{name} {value * 1e3:.0f} ms" for name, value in found.items()))
    assert found["help"] < ALLOWED * found["python"]


def test_help_and_version_import_nothing_heavy() -> None:
    program = (
        "import sys; from benchtool.cli import main; main(['--help']); main(['--version']); "
        f"print([name for name in {HEAVY!r} if name in sys.modules], file=sys.stderr)"
    )
    done = subprocess.run([sys.executable, "-c", program], check=True, capture_output=True, text=True)
    assert done.stderr.strip() == "[]"


if __name__ == "__main__":
    for name, value in medians().items():
        print(f"{name:8} {value * 1e3:6.1f} ms")
