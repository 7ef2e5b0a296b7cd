"""Measures a board of the simulated bench: every reading that the contract knows and the board allows.

Live readings come from the settled mains cycle of the reference, with the zeners as warm as their own loss
makes them; dead ones from the parts themselves, or from the reference's bench supply. What a perfect
meter would show is then spoilt by the meter's error, and now and then a word is mistaken.
"""

from __future__ import annotations

import copy
import math
from collections.abc import Callable, Iterator
from dataclasses import dataclass, field
from typing import Any
from unittest import mock

import numpy as np

from tests.make_samples import WARMTH, shown
from tests.reference import parts
from tests.reference.bench_boards import BY, METERS, OLD_AGE, SIGNS, WORDS, Fault, acting, circuit_of, states
from tests.reference.bench_supply import inject
from tests.reference.faults import apply_fault
from tests.reference.parts import COMMON, METER, Circuit, by_name, esr_of, loads_drawing, nominal_voltage
from tests.reference.simulate import Figures, simulate

ENOUGH = 1e-4  # the simulation's tolerance: far below what the meters resolve
WRONG_WORD = 0.02  # chance that a test in words is mistaken
LIVELY = 1000.0  # ohm: a varistor of less trips whatever feeds the board
Rng = np.random.Generator
Row = list[Any]  # what, rail, load, on, lifted, value as a case file has it


# ---- a board on the bench ------------------------------------------------------------------------


@dataclass
class Specimen:
    """One board: its design, its true parts, what is wrong with it, and how well it is measured.

    `laws` are the constants of its junctions, `meter` by how much its meters are worse than stated, `ramp` the
    window [s] of a capacitance meter that ramps (0: it does not), `pull_in` each coil's share of nominal.
    """

    design: dict[str, Any]
    true: Circuit
    told: Fault
    latent: Fault | None
    laws: dict[str, Any]
    meter: float
    ramp: float
    pull_in: dict[str, float]
    rng: Rng
    works: bool = True  # whether every load does what it should; known once measured
    known: dict[tuple[str, ...], Figures] = field(default_factory=dict)

    def __post_init__(self) -> None:
        """Take pairs and unexplained boards apart."""
        told = self.told
        self.faults: list[Fault] = list(told.get("of", [told, *([told["with"]] if "with" in told else [])]))
        self.faults += [self.latent] if self.latent else []

    def hit(self, *names: str, **where: str) -> Fault | None:
        """Return the first of the faults of these names at that place, if the board has one."""
        found = (fault for fault in self.faults if fault["fault"] in names)
        return next((fault for fault in found if all(fault.get(key) == part for key, part in where.items())), None)

    @property
    def path_open(self) -> bool:
        """Whether no mains get to the rectifier."""
        joint = self.hit("joint-open")
        return bool(self.hit("fuse-open", "inrush-open") or (joint and "rail" not in joint))

    @property
    def powered(self) -> bool:
        """Whether the board can be run at all: not with the mains across rectifier or varistor."""
        shorted = self.hit("dropper-short") or (self.hit("varistor-short") or {"resistance": LIVELY})["resistance"] < LIVELY
        return self.path_open or not shorted

    def marked_rail(self, name: str) -> dict[str, Any]:
        """Return a rail as marked [SI]."""
        return by_name(circuit_of(self.design)["board"]["rail"], name)

    def broken(self, on: list[str]) -> Circuit:
        """Return the circuit with its faults in and `on` commanded on, voltmeters on the rails and across a bare dropper."""
        circuit = copy.deepcopy(self.true) | {"on": list(on), "meter": METER}
        for fault in self.faults:
            circuit = apply_fault(circuit, acting(fault))
        if "bleeder" not in circuit["board"] or "bleeder" in circuit["removed"]:
            circuit["removed"] = [part for part in circuit["removed"] if part != "bleeder"]
            circuit["board"]["bleeder"] = {"resistance": METER}
        return circuit

    def own_laws(self) -> Any:
        """Return a context in which the reference's junctions have this board's constants."""
        return mock.patch.multiple("tests.reference.circuit", **self.laws)

    def settled(self, on: list[str]) -> Figures:
        """Return the figures of the running board in a state, its zeners warm; ArithmeticError if it does not settle."""
        circuit = self.broken(on)
        if self.path_open:
            return _nothing(circuit)
        drawing = tuple(sorted(load["name"] for load in loads_drawing(circuit)))
        if drawing not in self.known:
            with self.own_laws():
                self.known[drawing] = _warmed(circuit)
        return self.known[drawing]

    def injected(self, rail: str) -> float:
        """Return what the bench supply shows [V] on a rail, at default clamp and limit, switched loads off."""
        marked = self.marked_rail(rail)
        limit = min(1.2 * nominal_voltage(circuit_of(self.design), rail), marked["reservoir"]["rated_voltage"])
        with self.own_laws():
            return inject(self.broken([]), rail, 20e-3, limit)


def _nothing(circuit: Circuit) -> Figures:
    still = dict.fromkeys(("voltage_V", "ripple_pp_V", "ripple_rms_V"), 0.0)
    rails = [{"name": rail["name"]} | still for rail in circuit["board"]["rail"]]
    keys = ("line_current_A", "inrush_voltage_V", "dropper_voltage_V", "dropper_dc_V", "real_power_W")
    return {"rails": rails} | dict.fromkeys(keys, 0.0)


def _warmed(circuit: Circuit) -> Figures:
    """Return the figures with each zener as warm as its loss makes it, which grows with its voltage."""
    figures, moved = simulate(circuit, ENOUGH), 0.0
    for rail, found in zip(circuit["board"]["rail"], figures["rails"], strict=True):
        if "zener" in rail:
            volts = rail["zener"]["voltage"]
            share = float(np.interp(volts, [v for v, _ in WARMTH], [s for _, s in WARMTH]))
            rise = min(share * rail["kelvin_per_watt"] * found["zener_power_W"], 0.2)
            rail["zener"]["voltage"] = volts / (1.0 - rise)
            moved = max(moved, abs(rise * volts))
    figures = simulate(circuit, ENOUGH) if moved > 2e-3 else figures
    if not figures["settled"]:
        raise ArithmeticError("a board did not settle")
    return figures


# ---- the readings --------------------------------------------------------------------------------


def measured(board: Specimen) -> list[Row]:
    """Return every reading of a board, spoilt by its meters; notes in `board.works` whether its loads run."""
    rows = [row for part in (_live, _responses, _dead_parts, _dead_rails, _dead_loads) for row in part(board)]
    return [*rows, ["look", None, None, None, None, _look(board)]]


def _row(
    board: Specimen, what: str, value: float | str, rail: str | None = None, load: str | None = None,
    on: list[str] | None = None, lifted: bool | None = None,
) -> Row:  # fmt: skip
    """Return one reading: a number through the meter, or a word, now and then mistaken."""
    if isinstance(value, float):
        unit, share, floor = METERS[BY.get(what, what.rpartition("-")[2])]
        sigma = 0.5 * board.meter * math.hypot(share * value, floor)  # on a worse meter more than half its stated limit
        value += sigma * float(board.rng.standard_normal())
        value = shown(value if what in ("rail-voltage", "rail-injection") else max(value, 0.0), unit)
    elif what in WORDS and board.rng.random() < WRONG_WORD:
        value = str(board.rng.choice([word for word in WORDS[what] if word != value]))
    return [what, rail, load, on, lifted, value]


def _live(board: Specimen) -> Iterator[Row]:
    if not board.powered:
        return
    yield _row(board, "mains-voltage", float(board.broken([])["mains"]["voltage"]))
    for on in states(board.design):
        figures = board.settled(on)
        for rail in figures["rails"]:
            yield _row(board, "rail-voltage", rail["voltage_V"], rail["name"], on=on)
            yield _row(board, "rail-ripple", rail["ripple_pp_V"], rail["name"], on=on)
            yield _row(board, "rail-ripple-rms", rail["ripple_rms_V"], rail["name"], on=on)
        yield _row(board, "line-current", _line(board, figures), on=on)
        if "inrush" in board.design["board"]:
            opened = board.hit("inrush-open")  # then all the mains stand across it
            volts = board.true["mains"]["voltage"] if opened else figures["inrush_voltage_V"]
            yield _row(board, "inrush-voltage", volts, on=on)
        yield _row(board, "dropper-voltage", figures["dropper_voltage_V"], on=on)
        yield _row(board, "dropper-dc-voltage", figures["dropper_dc_V"], on=on)


def _line(board: Specimen, figures: Figures) -> float:
    """Return the current in the mains lead [A], a leaky varistor's included; no fuse, no current."""
    varistor, amps = board.hit("varistor-short"), float(figures["line_current_A"])
    if varistor is None or board.hit("fuse-open"):
        return amps
    own = board.true["mains"]["voltage"] / varistor["resistance"]
    return math.sqrt(amps**2 + 2.0 * figures["real_power_W"] / varistor["resistance"] + own**2)


# ---- do the loads do what they should ------------------------------------------------------------


def _responses(board: Specimen) -> Iterator[Row]:
    if not board.powered:
        board.works = False
        return
    for load in board.design["board"]["load"]:
        word = _response(board, load)
        board.works = board.works and word == "yes"
        yield _row(board, "load-responds", word, load=load["name"])


def _response(board: Specimen, load: dict[str, Any]) -> str:
    """Return what a load does when it is turned on (case format, section 4, load-responds)."""
    name = load["name"]
    idle, on = board.settled([]), board.settled([name] if load["switched"] else [])
    if board.hit("load-open", "coil-open", "switch-open", load=name):
        return "no"
    if board.hit("switch-stuck-on", load=name):
        return "always on" if _enough(board, load, idle, 0.0) else "no"
    if load["switched"] and not _lives(board, idle):
        return "no"
    if _enough(board, load, on, 0.0) and (not load["switched"] or _lives(board, on)):
        return "yes" if _enough(board, load, on, 0.5) else "chatters"
    if load["switched"] and _enough(board, load, idle, 0.0):  # pulled in by what the reservoir holds, and gone again
        return str(board.rng.choice(["chatters", "lets go", "no"], p=[0.45, 0.35, 0.2]))
    return "no"


def _alive_from(board: Specimen, rail: str) -> float:
    marked = board.marked_rail(rail)
    return min(0.6 * float(marked.get("regulated_voltage", marked.get("zener", {}).get("voltage"))), 4.0)


def _lives(board: Specimen, figures: Figures) -> bool:
    """Whether the controller can turn anything on: it draws, and stands above 60 % of its rail or 4 V."""
    load = next(load for load in board.design["board"]["load"] if load["kind"] == "current")
    volts = by_name(figures["rails"], load["rail"])["voltage_V"]
    return bool(volts >= _alive_from(board, load["rail"]) and not board.hit("load-open", load=load["name"]))


def _enough(board: Specimen, load: dict[str, Any], figures: Figures, trough: float) -> bool:
    """Whether the load gets voltage enough; with `trough`, that share of the ripple below the mean.

    A coil that has pulled in holds through the troughs down to 70 % of its pull-in voltage (common practice, no
    source): only below that it chatters.
    """
    marked = by_name(circuit_of(board.design)["board"]["load"], load["name"])
    rail, foot = by_name(figures["rails"], load["rail"]), load.get("returns_to", COMMON)
    volts = rail["voltage_V"] - (by_name(figures["rails"], foot)["voltage_V"] if foot != COMMON else 0.0)
    if load["kind"] == "coil":
        least = board.pull_in[load["name"]] * marked["nominal_voltage"] * (0.7 if trough else 1.0)
        return bool(volts - trough * rail["ripple_pp_V"] >= least)
    return bool(volts >= (1.15 * marked["forward_voltage"] if load["kind"] == "led" else _alive_from(board, load["rail"])))


# ---- dead ----------------------------------------------------------------------------------------


def _dead_parts(board: Specimen) -> Iterator[Row]:
    """The mains side: path, dropper, rectifier; and the joints."""
    has, rng = board.design["board"], board.rng
    fuse, leads = float(rng.uniform(0.05, 0.4)), float(rng.uniform(0.1, 0.6))
    inrush = float((board.hit("inrush-high") or board.true["board"].get("inrush", {})).get("resistance", 0.0))
    yield _row(board, "path-resistance", "open" if board.path_open else fuse + leads + inrush)
    if "fuse" in has:
        yield _row(board, "fuse-resistance", "open" if board.hit("fuse-open") else fuse)
    if "inrush" in has:
        yield _row(board, "inrush-resistance", "open" if board.hit("inrush-open") else inrush)
    if "varistor" in has:
        ohms = float((board.hit("varistor-short") or {"resistance": math.inf})["resistance"])
        yield _row(board, "varistor-resistance", "short" if ohms < 10.0 else "open" if ohms > 50e6 else ohms)
    if "bleeder" in has:
        ohms = _string(board, board.hit("dropper-short"))
        yield _row(board, "bleeder-resistance", "open" if math.isinf(ohms) else ohms)
    yield from _films(board)
    found = board.hit("diode-open", "diode-short")
    yield _row(board, "rectifier-test", found["fault"].removeprefix("diode-") if found else "good")
    stirs = rng.random() < (0.7 if board.hit("joint-open") else 0.03)
    yield _row(board, "tap-test", str(rng.choice(["cuts out", "comes back"], p=[0.3, 0.7])) if stirs else "no change")


def _string(board: Specimen, beside: Fault | None = None) -> float:
    """Return the bleeder [ohm] as it is read in place, a shorted dropper beside it."""
    if "bleeder" not in board.true["board"]:
        return math.inf
    bleeder = board.true["board"]["bleeder"]
    changed = board.hit("bleeder-open", "bleeder-low") or {"resistance": bleeder["resistance"] * bleeder["in_series"]}
    ohms = float(changed.get("resistance", math.inf))
    return 1.0 / (1.0 / ohms + 1.0 / beside["resistance"]) if beside else ohms


def _films(board: Specimen) -> Iterator[Row]:
    """The dropper in place and lifted, and a divider's second capacitor; in place a ramping meter reads high."""
    dropper = board.broken([])["board"]["dropper"]
    if board.design["board"]["dropper"]["kind"] == "resistor":
        return
    farads, high = dropper.get("capacitance", 0.0), 1.0
    if board.ramp and farads:
        folds = board.ramp / (_string(board) * farads)
        high = folds / -math.expm1(-folds) if folds > 1e-9 else 1.0
    found = board.hit("dropper-short") or board.hit("dropper-open")
    word = found["fault"].rpartition("-")[2] if found and "capacitance" not in found else None
    yield _row(board, "dropper-capacitance", word or farads * high, lifted=False)
    yield _row(board, "dropper-capacitance", word or farads, lifted=True)
    if "shunt_capacitance" in dropper:
        found = board.hit("shunt-capacitor-open", "shunt-capacitor-short")
        word = found["fault"].removeprefix("shunt-capacitor-") if found else None
        yield _row(board, "shunt-capacitance", word or dropper["shunt_capacitance"])


def _dead_rails(board: Specimen) -> Iterator[Row]:
    broken = board.broken([])["board"]["rail"]
    for rail in board.design["board"]["rail"]:
        name, now = rail["name"], by_name(broken, rail["name"])
        if rail.get("fed_through") == "resistor":
            ohms = now["feed_resistance"]
            word = "open" if board.hit("feed-open", rail=name) else "short" if ohms < 1.0 else None
            yield _row(board, "feed-resistance", word or ohms, name)
        if "zener" in rail:
            found = board.hit("zener-open", "zener-short", rail=name)
            word = found["fault"].removeprefix("zener-") if found else None
            yield _row(board, "zener-test", word or now["zener"]["voltage"], name)
        farads, leak = now["reservoir"]["capacitance"], _leak_ohms(board, "reservoir-leaky", name)
        gone = farads < 0.004 * board.marked_rail(name)["reservoir"]["capacitance"]
        yield _row(board, "reservoir-capacitance", "open" if gone else "short" if leak < 30.0 else farads, name)
        yield _row(board, "reservoir-esr", esr_of(now["reservoir"]), name)
        volts = 0.8 * nominal_voltage(circuit_of(board.design), name)
        sound = farads * volts * math.exp(board.rng.uniform(math.log(3e-4), math.log(5e-3)))
        yield _row(board, "reservoir-leakage", volts / leak + sound, name)
        bare = _bare_current(board, name, volts) + volts / _leak_ohms(board, "board-leakage", name)
        if bare < 0.2:  # more, and the supply goes into its limit: then it is not at 80 % of the rail
            yield _row(board, "rail-leakage", bare, name)
        yield _row(board, "rail-injection", board.injected(name), name, on=[])


def _leak_ohms(board: Specimen, fault: str, rail: str) -> float:
    found = board.hit(fault, rail=rail)
    return nominal_voltage(board.true, rail) / float(found["current"]) if found else math.inf


def _bare_current(board: Specimen, name: str, volts: float) -> float:
    """Return what the zeners from a bare rail down to common pass [A]; one before the series diode is not seen."""
    seen = board.true["board"]["rectifier"] != "half-wave-zener" or board.hit("diode-short")
    hidden = "" if seen else board.true["board"]["rail"][0]["name"]
    drops: list[Callable[[float], float]] = []
    while name != COMMON:
        now = by_name(board.broken([])["board"]["rail"], name)
        if "zener" not in now or board.hit("zener-open", rail=name) or name == hidden:
            return 0.0
        drops.append(_zener_drop(board, name, now["zener"]["voltage"]))
        name = now["zener"].get("clamps_to", COMMON)
    return _flowing(volts, lambda amps: sum(drop(amps) for drop in drops))


def _zener_drop(board: Specimen, name: str, volts: float) -> Callable[[float], float]:
    found = board.hit("zener-short", rail=name)
    if found:
        return lambda amps: float(amps * found["resistance"])
    return lambda amps: max(volts + board.laws["ZENER_SLOPE"] * math.log(amps / parts.ZENER_CURRENT), 0.0)


def _flowing(volts: float, drop: Callable[[float], float]) -> float:
    """Return the current [A] at which `drop` is `volts`; it rises with the current."""
    low, high = math.log(1e-12), math.log(1e3)
    for _ in range(60):
        middle = 0.5 * (low + high)
        low, high = (middle, high) if drop(math.exp(middle)) < volts else (low, middle)
    return math.exp(low)


def _dead_loads(board: Specimen) -> Iterator[Row]:
    """Each load from the bench supply, coils, transistors; what a gate draws without the mains nobody has defined."""
    broken = board.broken([])["board"]["load"]
    for load in board.design["board"]["load"]:
        name, now = load["name"], by_name(broken, load["name"])
        opened = board.hit("load-open", "coil-open", load=name)
        if load["kind"] != "gate":
            yield _row(board, "load-current", 0.0 if opened else _drawn(board, now), load=name)
        if load["kind"] == "coil":
            yield _row(board, "coil-resistance", "open" if opened else now["resistance"], load=name)
        if load["switched"]:
            stuck, dead = board.hit("switch-stuck-on", load=name), board.hit("switch-open", load=name)
            yield _row(board, "switch-test", "short" if stuck else "open" if dead else "good", load=name)


def _drawn(board: Specimen, load: dict[str, Any]) -> float:
    """Return what a load draws [A] at 90 % of its rail's voltage, its excess included."""
    marked, foot = circuit_of(board.design), load.get("returns_to", COMMON)
    volts = 0.9 * (nominal_voltage(marked, load["rail"]) - (nominal_voltage(marked, foot) if foot != COMMON else 0.0))
    excess = board.hit("load-excess", load=load["name"])
    if load["kind"] == "current":  # its excess is in its current already
        return float(load["current"] * math.tanh(volts / parts.LOAD_KNEE))
    more = float(excess["current"]) if excess else 0.0
    if load["kind"] == "led":
        zero = load["forward_voltage"] - parts.LED_SLOPE * math.log(parts.LED_CURRENT)
        return more + _flowing(volts, lambda i: float(zero + parts.LED_SLOPE * math.log(i) + i * load["resistance"]))
    return more + volts / float(load["resistance"])


def _look(board: Specimen) -> list[str]:
    """Return what is seen: what an old board shows anyway, and what its faults show."""
    seen = [word for word, chance in OLD_AGE.items() if board.rng.random() < chance]
    for fault in board.faults:
        percent, word = SIGNS.get(fault["fault"], (0.0, ""))
        seen += [word] if 100.0 * board.rng.random() < percent else []
    return list(dict.fromkeys(seen)) or ["nothing seen"]
