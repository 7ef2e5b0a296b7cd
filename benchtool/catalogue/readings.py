"""Every reading a technician may take: what it needs, in which condition, which words it knows, what it costs.

One row a reading. What the meter shows on a given specimen stands in `shows.py`; the catalogue tests demand both.
Minutes are working time with set-up: common practice, no source.
"""

from __future__ import annotations

from dataclasses import dataclass
from typing import Literal

Condition = Literal["live", "dead"]


@dataclass(frozen=True, slots=True)
class ReadingKind:
    """One kind of reading.

    `unit` is SI, None where only words are read. `low` and `high` bound what a file accepts [`unit`]; None means that the
    board sets the bound (see `accepted`). `meter` names the field of `Meter` that gives its accuracy.
    `needs` and `may` name the qualifiers: rail, load (needed), on, lifted, clamp, limit (allowed).
    """

    name: str
    label: str
    condition: Condition
    unit: str | None
    minutes: float
    meter: str | None = None
    needs: tuple[str, ...] = ()
    may: tuple[str, ...] = ()
    words: tuple[str, ...] = ()
    several: bool = False
    low: float = 0.0
    high: float | None = None
    minutes_lifted: float | None = None


OPEN = ("open",)
OPEN_SHORT = ("open", "short")
GOOD = ("good", "open", "short")
LOOK_WORDS = (
    "nothing seen",
    "bulged reservoir",
    "scorched inrush",
    "burnt zener",
    "cracked dropper",
    "cracked varistor",
    "blown fuse",
    "browned board",
    "residue",
    "dry joint",
    "earlier repair",
)
OHMS = 1e9
"""The highest resistance a file accepts as a number [ohm]; above it the word is `open`."""

READINGS: tuple[ReadingKind, ...] = (
    ReadingKind("mains-voltage", "mains voltage", "live", "V", 1, "ac_voltage"),
    ReadingKind("rail-voltage", "{rail}", "live", "V", 1, "dc_voltage", ("rail",), ("on",), low=-5.0),
    ReadingKind("rail-ripple", "{rail} ripple, peak to peak", "live", "V", 4, "ripple", ("rail",), ("on",)),
    ReadingKind("rail-ripple-rms", "{rail} ripple, RMS", "live", "V", 1, "ac_low_voltage", ("rail",), ("on",)),
    ReadingKind("line-current", "line current", "live", "A", 8, "ac_current", (), ("on",), high=100.0),
    ReadingKind("inrush-voltage", "across inrush resistor", "live", "V", 2, "ac_low_voltage", (), ("on",)),
    ReadingKind("dropper-voltage", "across dropper, AC", "live", "V", 2, "ac_voltage", (), ("on",)),
    ReadingKind("dropper-dc-voltage", "across dropper, DC", "live", "V", 2, "dc_voltage", (), ("on",)),
    ReadingKind(
        "load-responds", "{load} responds", "live", None, 1, None, ("load",),
        words=("yes", "no", "always on", "chatters", "lets go"),
    ),
    ReadingKind(
        "dropper-capacitance", "dropper capacitance", "dead", "F", 2, "capacitance", (), ("lifted",), OPEN_SHORT,
        high=1e-2, minutes_lifted=6,
    ),
    ReadingKind("shunt-capacitance", "divider's second capacitor", "dead", "F", 6, "capacitance", words=OPEN_SHORT, high=1e-2),
    ReadingKind("fuse-resistance", "fuse", "dead", "ohm", 1, "resistance", words=OPEN, high=OHMS),
    ReadingKind("varistor-resistance", "varistor, lifted", "dead", "ohm", 4, "resistance", words=OPEN_SHORT, high=OHMS),
    ReadingKind("path-resistance", "mains path, plug to dropper", "dead", "ohm", 1, "resistance", words=OPEN, high=OHMS),
    ReadingKind("inrush-resistance", "inrush resistor", "dead", "ohm", 1, "resistance", words=OPEN_SHORT, high=OHMS),
    ReadingKind("bleeder-resistance", "bleeder, whole string", "dead", "ohm", 1, "resistance", words=OPEN, high=OHMS),
    ReadingKind("rectifier-test", "rectifier, diode test", "dead", None, 3, None, words=GOOD),
    ReadingKind("feed-resistance", "{rail} feed resistor", "dead", "ohm", 1, "resistance", ("rail",), words=OPEN_SHORT, high=OHMS),
    ReadingKind("zener-test", "{rail} zener at 5 mA", "dead", "V", 6, "dc_voltage", ("rail",), words=OPEN_SHORT, high=1000.0),
    ReadingKind(
        "reservoir-capacitance", "{rail} reservoir capacitance", "dead", "F", 5, "capacitance", ("rail",),
        words=OPEN_SHORT, high=10.0,
    ),
    ReadingKind("reservoir-esr", "{rail} reservoir ESR", "dead", "ohm", 1, "resistance", ("rail",), words=OPEN, high=OHMS),
    ReadingKind("reservoir-leakage", "{rail} reservoir leakage", "dead", "A", 10, "dc_current", ("rail",), high=100.0),
    ReadingKind("rail-leakage", "{rail} bare rail leakage", "dead", "A", 10, "dc_current", ("rail",), high=100.0),
    ReadingKind(
        "rail-injection", "{rail} on the bench supply", "dead", "V", 3, "dc_voltage", ("rail",), ("on", "clamp", "limit"),
        low=-5.0,
    ),
    ReadingKind("load-current", "{load} draws, bench supply", "dead", "A", 6, "dc_current", ("load",), high=100.0),
    ReadingKind("coil-resistance", "{load} coil resistance", "dead", "ohm", 1, "resistance", ("load",), words=OPEN_SHORT, high=OHMS),
    ReadingKind("switch-test", "{load}'s transistor", "dead", None, 4, None, ("load",), words=GOOD),
    ReadingKind("tap-test", "joints pressed, bench supply", "dead", None, 4, None, words=("no change", "cuts out", "comes back")),
    ReadingKind("look", "look", "dead", None, 2, None, (), ("rail", "load"), words=LOOK_WORDS, several=True),
)
READING_KINDS = {kind.name: kind for kind in READINGS}
