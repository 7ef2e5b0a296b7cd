"""What the meter shows: for every reading, what it would be on each specimen. The one place where a reading is defined.

A number comes with the physics' own error (one sigma) beside the meter's; a specimen on which the meter shows a word instead
is marked `opened` or `shorted`; readings in words give a chance for each word. `look` hangs on the fault itself and is
judged in the diagnosis.
"""

from __future__ import annotations

from collections.abc import Callable
from dataclasses import dataclass, field

import numpy as np

from benchtool.board import Board, Unknown, nominal_voltage
from benchtool.observed import Check
from benchtool.physics import branches
from benchtool.physics import constants as known
from benchtool.physics.bench import Bench
from benchtool.physics.laws import Array, Flags, copper_ratio
from benchtool.physics.network import COIL_WARM_KELVIN
from benchtool.physics.ripple import UNCERTAIN
from benchtool.physics.specimens import Junction, Specimens, Switch

RAIL_ERROR, RAIL_ERROR_FLOOR = 0.008, 0.05
"""One sigma of the physics on a rail's mean, as a crowd is settled: share, and volts."""
SAG_ERROR, ROUGH_FROM = 0.4, 0.10
"""One sigma of the sag that a rough rail's zener makes by clipping the crests, as a share of its ripple over `ROUGH_FROM`."""
RIPPLE_ERROR, RIPPLE_ERROR_FLOOR = UNCERTAIN, 0.005
LINE_ERROR = 0.015
UNSOLVED = 0.2
"""One sigma, as a share, of a specimen whose cycle did not repeat."""
RAMP_SECONDS = 0.3
"""Longest window of meters that ramp at constant current; common practice, no source. Half of all meters do not ramp."""
SURE = 0.96
"""Chance that a test in words gives the true word."""


@dataclass(frozen=True, slots=True)
class Shown:
    """What a reading shows. Numbers: `value`, `error` (one sigma of the physics), (n,), with words by `opened`, `shorted`.

    Words only: `chances`, word → (n,), adding up to one.
    """

    value: Array | None = None
    error: Array | float = 0.0
    opened: Flags | None = None
    shorted: Flags | None = None
    chances: dict[str, Array] = field(default_factory=dict)


Shows = Callable[[Bench, Board, Check], Shown]


def _rail(board: Board, check: Check) -> int:
    return board.rail_index(check.rail or board.rails[0].name)


def _load(board: Board, check: Check) -> int:
    return [load.name for load in board.loads].index(check.load or "")


def _warm(check: Check) -> bool:
    return check.when == "warm"


def _resistance(value: Array, error: float = 0.0) -> Shown:
    return Shown(value, error * _finite(value), opened=np.isinf(value), shorted=value < 1.0)


def _finite(value: Array) -> Array:
    """The numbers, nil where the meter shows a word."""
    return np.where(np.isfinite(value), value, 0.0)


def _mains(bench: Bench, board: Board, check: Check) -> Shown:
    return Shown(bench.specimens.mains)


def _rail_voltage(bench: Bench, board: Board, check: Check) -> Shown:
    settled, index = bench.settled(check.on, warm=_warm(check)), _rail(board, check)
    value, ripple = settled.rail_voltage[index], settled.ripple_pp[index]
    clips = settled.zener_current[index] > known.REGULATES_FROM
    rough = np.where(clips, np.maximum(ripple - ROUGH_FROM * np.abs(value), 0.0), 0.0)
    unsolved = np.where(settled.converged, 0.0, UNSOLVED * np.abs(value))
    return Shown(value, np.hypot(RAIL_ERROR * np.abs(value) + RAIL_ERROR_FLOOR, SAG_ERROR * rough) + unsolved)


def _ripple(bench: Bench, board: Board, check: Check) -> Shown:
    value = bench.settled(check.on, warm=_warm(check)).ripple_pp[_rail(board, check)]
    return Shown(value, RIPPLE_ERROR * value + RIPPLE_ERROR_FLOOR)


def _ripple_rms(bench: Bench, board: Board, check: Check) -> Shown:
    value = bench.settled(check.on, warm=_warm(check)).ripple_rms[_rail(board, check)]
    return Shown(value, RIPPLE_ERROR * value + RIPPLE_ERROR_FLOOR / 2.0)


def _line_current(bench: Bench, board: Board, check: Check) -> Shown:
    value = bench.settled(check.on, warm=_warm(check)).line_current
    return Shown(value, LINE_ERROR * value)


def _inrush_voltage(bench: Bench, board: Board, check: Check) -> Shown:
    """An open inrush resistor stands between the mains and a dropper that passes nothing: the whole mains are across it."""
    current = bench.settled(check.on, warm=_warm(check)).line_current
    resistance = bench.specimens.inrush
    across = np.isinf(resistance) & np.isfinite(bench.specimens.fuse + bench.specimens.joint)
    value = np.where(across, bench.specimens.mains, current * np.where(np.isinf(resistance), 0.0, resistance))
    return Shown(value, LINE_ERROR * value + np.where(across, 0.2 * value, 0.0))


def _dropper_voltage(bench: Bench, board: Board, check: Check) -> Shown:
    value = bench.settled(check.on, warm=_warm(check)).dropper_voltage
    return Shown(value, LINE_ERROR * value + 1.0)


def _dropper_dc(bench: Bench, board: Board, check: Check) -> Shown:
    value = bench.settled(check.on, warm=_warm(check)).dropper_dc
    return Shown(value, 0.05 * value + 0.5)


def runs(bench: Bench, board: Board, load: int, on: tuple[str, ...], *, warm: bool = False) -> tuple[Array, Array]:
    """Chance that load `load` runs with the loads `on` commanded on, itself among them, and that it runs unasked, each (n,).

    A switched load needs the controller alive, its transistor and voltage enough; see the case format's section 4.
    """
    specimens, record = bench.specimens, board.loads[load]
    enough_on = _enough(bench, board, load, on, warm)
    if not record.switched:
        return enough_on, np.zeros(specimens.count)
    switch = specimens.switch[load]
    lives = _controller_lives(bench, board, on, warm)
    stuck = switch == Switch.STUCK
    meant_chance = np.where(stuck, enough_on, np.where(switch == Switch.OPEN, 0.0, enough_on * lives))
    return meant_chance, np.where(stuck, _enough(bench, board, load, (), warm), 0.0)


def _enough(bench: Bench, board: Board, load: int, on: tuple[str, ...], warm: bool) -> Array:
    """Whether the load gets voltage enough to act in the troughs of the ripple too, 0 or 1, (n,)."""
    specimens, record = bench.specimens, board.loads[load]
    settled = bench.settled(on, warm=warm)
    voltage = settled.load_voltage[load] - settled.ripple_pp[board.rail_index(record.rail)] / 2.0
    intact = specimens.load_open[load] == 0.0
    if record.kind == "coil":
        nominal = record.nominal_voltage or float(nominal_voltage(board, board.rail(record.rail)) or 0.0)
        pull_in = specimens.pull_in[load] * nominal * (float(copper_ratio(25.0 + COIL_WARM_KELVIN)) if warm else 1.0)
        return np.asarray(intact & (voltage >= pull_in), dtype=float)
    if record.kind == "led":
        return np.asarray(intact & (voltage >= known.LED_LIGHTS_FROM * specimens.load_forward[load]), dtype=float)
    return np.asarray(intact & (voltage >= _alive_from(board, board.rail_index(record.rail))), dtype=float)


def _alive_from(board: Board, rail: int) -> float:
    """Volts on rail `rail` above which a controller lives."""
    zener = board.rails[rail].zener
    if zener is None or isinstance(zener.voltage, Unknown):
        return known.LIVES_FROM_VOLTS
    return min(known.LIVES_FROM_SHARE * zener.voltage, known.LIVES_FROM_VOLTS)


def _controller_lives(bench: Bench, board: Board, on: tuple[str, ...], warm: bool) -> Array:
    controllers = [load for load in board.loads if load.kind == "current"]
    if not controllers:
        return np.ones(bench.specimens.count)
    index = board.rail_index(controllers[0].rail)
    return np.asarray(bench.settled(on, warm=warm).rail_voltage[index] >= _alive_from(board, index), dtype=float)


def _responds(bench: Bench, board: Board, check: Check) -> Shown:
    load = _load(board, check)
    on = (board.loads[load].name,) if board.loads[load].switched else ()
    when_meant, when_not = runs(bench, board, load, on, warm=_warm(check))
    always = when_not * SURE
    yes = when_meant * (1.0 - when_not) * SURE
    rest = 1.0 - always - yes
    weak = rest * 0.15
    return Shown(chances={"yes": yes, "always on": always, "no": rest - 2.0 * weak, "chatters": weak, "lets go": weak})


def _dropper_capacitance(bench: Bench, board: Board, check: Check) -> Shown:
    """Across the bleeder a meter that ramps reads high by x/(1 − e^−x), x = window/RC; half of all meters do not ramp."""
    specimens = bench.specimens
    value = specimens.capacitance
    if not check.lifted:
        window = RAMP_SECONDS * np.maximum(2.0 * bench.chance() - 1.0, 0.0)
        x = np.clip(window / np.maximum(specimens.bleeder * value, 1e-12), 1e-9, 50.0)
        value = value * np.where(np.isinf(specimens.bleeder), 1.0, x / -np.expm1(-x))
    mark = board.dropper.capacitance
    floor = 0.02 * mark if isinstance(mark, float) else 1e-9
    shorted = np.isfinite(specimens.dropper_short)
    return Shown(np.where(shorted, np.inf, value), opened=specimens.capacitance < floor, shorted=shorted)


def _shunt_capacitance(bench: Bench, board: Board, check: Check) -> Shown:
    value, mark = bench.specimens.shunt, board.dropper.shunt_capacitance
    floor = 0.02 * mark if isinstance(mark, float) else 1e-9
    shorted = np.isfinite(bench.specimens.shunt_short)
    return Shown(np.where(shorted, np.inf, value), opened=value < floor, shorted=shorted)


def _fuse(bench: Bench, board: Board, check: Check) -> Shown:
    cold = 0.2 + bench.specimens.fuse
    return Shown(cold, 0.2, opened=np.isinf(cold))


def _varistor(bench: Bench, board: Board, check: Check) -> Shown:
    value = bench.specimens.varistor
    return Shown(value, 0.05 * _finite(value), opened=np.isinf(value), shorted=value < 50.0)


def _path(bench: Bench, board: Board, check: Check) -> Shown:
    return _resistance(bench.specimens.series_resistance + 0.3, 0.002)


def _inrush(bench: Bench, board: Board, check: Check) -> Shown:
    return _resistance(bench.specimens.inrush)


def _bleeder(bench: Bench, board: Board, check: Check) -> Shown:
    return _resistance(bench.specimens.bleeder)


def _rectifier(bench: Bench, board: Board, check: Check) -> Shown:
    state = bench.specimens.junction
    opened = (state == Junction.SERIES_OPEN) | (state == Junction.RETURN_OPEN)
    shorted = (state == Junction.SERIES_SHORT) | (state == Junction.RETURN_SHORT)
    return _three_words(opened, shorted, ("good", "open", "short"))


def _three_words(second: Flags, third: Flags, words: tuple[str, str, str]) -> Shown:
    """Chances of three words, the first where neither flag is set."""
    doubt = (1.0 - SURE) / 2.0
    flags = (~second & ~third, second, third)
    return Shown(chances={word: np.where(flag, SURE, doubt) for word, flag in zip(words, flags, strict=True)})


def _feed(bench: Bench, board: Board, check: Check) -> Shown:
    return _resistance(bench.specimens.feed[_rail(board, check)])


def _zener(bench: Bench, board: Board, check: Check) -> Shown:
    index = _rail(board, check)
    short, voltage = bench.specimens.zener_short[index], bench.specimens.zener[index]
    shorted = np.isfinite(short)
    value = np.where(shorted, np.minimum(known.ZENER_CURRENT * short, voltage), voltage)
    return Shown(value, 0.01 * _finite(value), opened=np.isinf(value), shorted=shorted)


def _reservoir(bench: Bench, board: Board, check: Check) -> Shown:
    index = _rail(board, check)
    value, healthy = bench.specimens.reservoir[index], board.rails[index].reservoir
    mark = healthy.capacitance if healthy is not None else None
    floor = 0.01 * mark if isinstance(mark, float) else 1e-9
    return Shown(value, 0.02 * value, opened=value < floor, shorted=bench.specimens.reservoir_leak[index] < 20.0)


def _esr(bench: Bench, board: Board, check: Check) -> Shown:
    value = bench.specimens.esr[_rail(board, check)]
    return Shown(value, 0.05 * _finite(value), opened=value > 1e3)


def _test_volts(board: Board, index: int, share: float) -> float:
    return share * (nominal_voltage(board, board.rails[index]) or 12.0)


def _reservoir_leakage(bench: Bench, board: Board, check: Check) -> Shown:
    """A sound electrolytic leaks a fraction of its limit 0.01·C·V or 3 µA (Panasonic NHG)."""
    index = _rail(board, check)
    volts = _test_volts(board, index, 0.8)
    sound = np.maximum(0.002 * bench.specimens.reservoir[index] * volts, 1e-6)
    return Shown(volts / bench.specimens.reservoir_leak[index] + sound, 0.5 * sound)


def _rail_leakage(bench: Bench, board: Board, check: Check) -> Shown:
    index = _rail(board, check)
    volts = _test_volts(board, index, 0.8)
    specimens, shape = bench.specimens, bench.specimens.shape
    alone = shape.rails[index].clamps_to < 0 and not (index == 0 and shape.zener_at_node)
    through = np.zeros(specimens.count)
    if alone:
        through, _ = branches.zener(np.full(specimens.count, volts), specimens.zener[index], specimens.zener_short[index])
    value = volts / specimens.board_leak[index] + np.minimum(through, 1.0)
    return Shown(value, 0.05 * value + 5e-6)


INJECTION_CLAMP, INJECTION_OVER = 0.020, 1.2
"""Default current limit of rail-injection [A], and its voltage limit over the rail's nominal voltage; the case format."""
INJECTION_UNKNOWN = 12.0
"""Voltage limit where the rail has no nominal voltage [V]."""


def injection_limits(board: Board, check: Check) -> tuple[float, float]:
    """Current [A] and voltage [V] limit of a rail-injection, as stated or by default, never above the reservoir's rating."""
    rail = board.rails[_rail(board, check)]
    nominal = nominal_voltage(board, rail)
    limit = check.limit or (INJECTION_UNKNOWN if nominal is None else INJECTION_OVER * nominal)
    rated = None if rail.reservoir is None else rail.reservoir.rated_voltage
    limit = limit if rated is None or check.limit is not None else min(limit, rated)
    return check.clamp or INJECTION_CLAMP, limit


def _injection(bench: Bench, board: Board, check: Check) -> Shown:
    clamp, limit = injection_limits(board, check)
    volts = bench.injected(check.on or (), _rail(board, check), clamp, limit)
    solved = np.isfinite(volts)
    value = np.where(solved, volts, limit / 2.0)
    return Shown(value, 0.003 * value + 0.02 + np.where(solved, 0.0, limit))


def _load_current(bench: Bench, board: Board, check: Check) -> Shown:
    """From a bench supply at 90 % of the rail's voltage, across the load itself."""
    number = _load(board, check)
    load, specimens = board.loads[number], bench.specimens
    foot = 0.0 if load.returns_to == "common" else _test_volts(board, board.rail_index(load.returns_to), 0.9)
    voltage = np.full(specimens.count, max(_test_volts(board, board.rail_index(load.rail), 0.9) - foot, 0.0))
    drawn = _branch(specimens, number, voltage) + voltage * specimens.load_excess[number]
    return Shown(np.where(specimens.load_open[number] == 0.0, drawn, 0.0), 0.02 * drawn)


def _branch(specimens: Specimens, number: int, voltage: Array) -> Array:
    kind = specimens.shape.loads[number].kind
    if kind in ("current", "gate"):
        return branches.constant_current(voltage, specimens.load_current[number])[0]
    if kind == "led":
        return branches.led(voltage, specimens.load_forward[number], specimens.load_resistance[number])[0]
    return branches.resistor(voltage, specimens.load_resistance[number])[0]


def _coil(bench: Bench, board: Board, check: Check) -> Shown:
    number = _load(board, check)
    specimens = bench.specimens
    value = np.where(specimens.load_open[number] > 0.0, np.inf, specimens.load_resistance[number])
    return _resistance(value, 0.005)


def _switch(bench: Bench, board: Board, check: Check) -> Shown:
    state = bench.specimens.switch[_load(board, check)]
    return _three_words(np.asarray(state == Switch.OPEN), np.asarray(state == Switch.STUCK), ("good", "open", "short"))


def _tap(bench: Bench, board: Board, check: Check) -> Shown:
    """A bad joint mostly shows itself when it is pressed; whether it then cuts out or comes back is an even chance."""
    bad = np.isinf(bench.specimens.joint) | np.isinf(bench.specimens.rail_joint).any(axis=0)
    stirs = np.where(bad, 0.7, 0.03)
    return Shown(chances={"no change": 1.0 - stirs, "cuts out": stirs / 2.0, "comes back": stirs / 2.0})


SHOWS: dict[str, Shows] = {
    "mains-voltage": _mains,
    "rail-voltage": _rail_voltage,
    "rail-ripple": _ripple,
    "rail-ripple-rms": _ripple_rms,
    "line-current": _line_current,
    "inrush-voltage": _inrush_voltage,
    "dropper-voltage": _dropper_voltage,
    "dropper-dc-voltage": _dropper_dc,
    "load-responds": _responds,
    "dropper-capacitance": _dropper_capacitance,
    "shunt-capacitance": _shunt_capacitance,
    "fuse-resistance": _fuse,
    "varistor-resistance": _varistor,
    "path-resistance": _path,
    "inrush-resistance": _inrush,
    "bleeder-resistance": _bleeder,
    "rectifier-test": _rectifier,
    "feed-resistance": _feed,
    "zener-test": _zener,
    "reservoir-capacitance": _reservoir,
    "reservoir-esr": _esr,
    "reservoir-leakage": _reservoir_leakage,
    "rail-leakage": _rail_leakage,
    "rail-injection": _injection,
    "load-current": _load_current,
    "coil-resistance": _coil,
    "switch-test": _switch,
    "tap-test": _tap,
}
"""Readings that the physics can foretell: all but `look`."""
