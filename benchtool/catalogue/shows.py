"""What the meter shows: for every reading, what it would be on each specimen. The one place where a reading is defined.

A number comes with the physics' own error (one sigma) beside the meter's; a specimen on which the meter shows a word instead
is marked `opened` or `shorted`; readings in words give a chance for each word. `look` hangs on the fault itself and is
judged in the diagnosis.
"""

from __future__ import annotations

from collections.abc import Callable

import numpy as np

from benchtool.board import Board, nominal_voltage
from benchtool.catalogue.meters import alternating, misread_junction, ramped
from benchtool.catalogue.runs import runs
from benchtool.catalogue.shown import Shown, View
from benchtool.observed import Check
from benchtool.physics import branches
from benchtool.physics import constants as known
from benchtool.physics.laws import Array, Flags
from benchtool.physics.settled import Settled
from benchtool.physics.specimens import Junction, Specimens, Switch

RAIL_ERROR, RAIL_ERROR_FLOOR = 0.003, 0.02
"""One sigma of the physics on a rail's mean, as a crowd is settled: share, and volts. This and the next two: by what the crowd's
coarse steps differ from the reference (`python -m tests.compared crowd`).
"""
FLOATS, NOTHING_FLOWS = 10.0, 3e-6
"""One sigma of a rail that nothing feeds and no load is on [V], and the current under which it counts as not fed [A]: what leaks
past parts that block, and the meter itself, decide there.
"""
LEAST_DROPPER = 10e-9
"""Dropper [F] that lets nothing by that could lift a rail."""
RIPPLE_ERROR, RIPPLE_ERROR_FLOOR = 0.05, 0.01
LINE_ERROR, LINE_ERROR_FLOOR = 0.01, 1.5e-4
"""Share, and amperes: what leaks past a part that blocks is left out of the physics."""
UNSOLVED = 0.2
"""One sigma, as a share, of a specimen whose cycle did not repeat."""
SURE = 0.96
"""Chance that a test in words gives the true word."""

Shows = Callable[[View], Shown]


def _resistance(value: Array, error: float = 0.0) -> Shown:
    return Shown(value, error * _finite(value), opened=np.isinf(value), shorted=value < 1.0)


def _finite(value: Array) -> Array:
    """The numbers, nil where the meter shows a word."""
    return np.where(np.isfinite(value), value, 0.0)


def _mains(view: View) -> Shown:
    return Shown(view.specimens.mains)


def _rail_voltage(view: View) -> Shown:
    """A DC range shows the mean, whatever ripple stands on it."""
    settled, index = view.settled, view.rail
    value = settled.rail_voltage[index]
    floats = np.where(_floats(view), FLOATS, 0.0)
    return Shown(value, RAIL_ERROR * np.abs(value) + RAIL_ERROR_FLOOR + floats + _unsolved(settled, value))


def _floats(view: View) -> Flags:
    """Where a supply that blocks leaves the rail to what leaks, with no load on it, so that leaks decide its voltage; (n,)."""
    settled, index, specimens = view.settled, view.rail, view.specimens
    fed = np.abs(settled.zener_current[index]) + (np.abs(settled.supply_current) if index == 0 else 0.0)
    loaded = np.zeros(specimens.count, dtype=bool)
    commanded = specimens.shape.commanded(view.check.on or ())
    for number, load in enumerate(specimens.shape.loads):
        if index in (load.rail, load.returns_to) and load.kind != "led":
            runs_on = (commanded[number] & (specimens.switch[number] != Switch.OPEN)) | (specimens.switch[number] == Switch.STUCK)
            loaded |= runs_on & (specimens.load_open[number] == 0.0)
    plugged_in = np.isfinite(specimens.series_resistance) & (specimens.capacitance > LEAST_DROPPER)
    return np.asarray((fed < NOTHING_FLOWS) & ~loaded & plugged_in)


def _unsolved(settled: Settled, value: Array) -> Array:
    """What is added to the error where the cycle did not repeat."""
    return np.where(settled.converged, 0.0, UNSOLVED * np.abs(value))


def _ripple(view: View) -> Shown:
    settled = view.settled
    value = settled.ripple_pp[view.rail]
    return Shown(value, RIPPLE_ERROR * value + RIPPLE_ERROR_FLOOR + _unsolved(settled, value))


def _ripple_rms(view: View) -> Shown:
    settled = view.settled
    value = alternating(view, settled.ripple_rms[view.rail], settled.ripple_average[view.rail])
    return Shown(value, RIPPLE_ERROR * value + RIPPLE_ERROR_FLOOR / 3.0 + _unsolved(settled, value))


def _line_current(view: View) -> Shown:
    value = _line(view)
    return Shown(value, _line_error(view, value))


def _line_error(view: View, current: Array) -> Array:
    """One sigma [A] of the physics on `current` in the mains lead [A], (n,); nil where the lead is cut."""
    return np.where(np.isfinite(view.specimens.series_resistance), LINE_ERROR * current + LINE_ERROR_FLOOR, 0.0)


def _line(view: View) -> Array:
    """The current in the mains lead [A] as the meter shows it, (n,)."""
    settled = view.settled
    return alternating(view, settled.line_current, settled.line_average)


def _inrush_voltage(view: View) -> Shown:
    """An open inrush resistor stands between the mains and a dropper that passes nothing: the whole mains are across it."""
    current = _line(view)
    resistance = view.specimens.inrush
    across = np.isinf(resistance) & np.isfinite(view.specimens.fuse + view.specimens.joint)
    whole = np.where(np.isinf(resistance), 0.0, resistance)
    value = np.where(across, view.specimens.mains, current * whole)
    return Shown(value, np.where(across, 0.2 * value, _line_error(view, current) * whole))


def _dropper_voltage(view: View) -> Shown:
    settled = view.settled
    value = alternating(view, settled.dropper_voltage, settled.dropper_average)
    return Shown(value, LINE_ERROR * value + 1.0)


def _dropper_dc(view: View) -> Shown:
    value = view.settled.dropper_dc
    return Shown(value, 0.05 * value + 0.5)


def _responds(view: View) -> Shown:
    load = view.load
    on = (view.board.loads[load].name,) if view.board.loads[load].switched else ()
    when_meant, when_not = runs(view.bench, view.board, load, on, warm=view.warm, where=view.where)
    always = when_not * SURE
    yes = when_meant * (1.0 - when_not) * SURE
    rest = 1.0 - always - yes
    weak = rest * 0.15
    return Shown(chances={"yes": yes, "always on": always, "no": rest - 2.0 * weak, "chatters": weak, "lets go": weak})


def _dropper_capacitance(view: View) -> Shown:
    specimens = view.specimens
    value = specimens.capacitance
    if not view.check.lifted:
        value = ramped(value, specimens.bleeder, view.bench.chance())
    mark = view.board.dropper.capacitance
    floor = 0.02 * mark if isinstance(mark, float) else 1e-9
    shorted = np.isfinite(specimens.dropper_short)
    return Shown(np.where(shorted, np.inf, value), opened=specimens.capacitance < floor, shorted=shorted)


def _shunt_capacitance(view: View) -> Shown:
    value, mark = view.specimens.shunt, view.board.dropper.shunt_capacitance
    floor = 0.02 * mark if isinstance(mark, float) else 1e-9
    shorted = np.isfinite(view.specimens.shunt_short)
    return Shown(np.where(shorted, np.inf, value), opened=value < floor, shorted=shorted)


def _fuse(view: View) -> Shown:
    cold = 0.2 + view.specimens.fuse
    return Shown(cold, 0.2, opened=np.isinf(cold))


def _varistor(view: View) -> Shown:
    value = view.specimens.varistor
    return Shown(value, 0.05 * _finite(value), opened=np.isinf(value), shorted=value < 50.0)


def _path(view: View) -> Shown:
    return _resistance(view.specimens.series_resistance + 0.3, 0.002)


def _inrush(view: View) -> Shown:
    return _resistance(view.specimens.inrush)


def _bleeder(view: View) -> Shown:
    return _resistance(view.specimens.bleeder)


def _rectifier(view: View) -> Shown:
    state = view.specimens.junction
    opened = (state == Junction.SERIES_OPEN) | (state == Junction.RETURN_OPEN)
    shorted = (state == Junction.SERIES_SHORT) | (state == Junction.RETURN_SHORT)
    shown = _three_words(opened, shorted, ("good", "open", "short")).chances
    misread = shown["good"] * misread_junction(view)
    return Shown(chances={**shown, "good": shown["good"] - misread, "short": shown["short"] + misread})


def _three_words(second: Flags, third: Flags, words: tuple[str, str, str]) -> Shown:
    """Chances of three words, the first where neither flag is set."""
    doubt = (1.0 - SURE) / 2.0
    flags = (~second & ~third, second, third)
    return Shown(chances={word: np.where(flag, SURE, doubt) for word, flag in zip(words, flags, strict=True)})


def _feed(view: View) -> Shown:
    return _resistance(view.specimens.feed[view.rail])


def _zener(view: View) -> Shown:
    index = view.rail
    short, voltage = view.specimens.zener_short[index], view.specimens.zener[index]
    shorted = np.isfinite(short)
    value = np.where(shorted, np.minimum(known.ZENER_CURRENT * short, voltage), voltage)
    return Shown(value, 0.01 * _finite(value), opened=np.isinf(value), shorted=shorted)


def _reservoir(view: View) -> Shown:
    index = view.rail
    value, healthy = view.specimens.reservoir[index], view.board.rails[index].reservoir
    mark = healthy.capacitance if healthy is not None else None
    floor = 0.01 * mark if isinstance(mark, float) else 1e-9
    return Shown(value, 0.02 * value, opened=value < floor, shorted=view.specimens.reservoir_leak[index] < 20.0)


def _esr(view: View) -> Shown:
    value = view.specimens.esr[view.rail]
    return Shown(value, 0.05 * _finite(value), opened=value > 1e3)


def _test_volts(board: Board, index: int, share: float) -> float:
    return share * (nominal_voltage(board, board.rails[index]) or 12.0)


def _reservoir_leakage(view: View) -> Shown:
    """A sound electrolytic leaks a fraction of its limit 0.01·C·V or 3 µA (Panasonic NHG)."""
    index = view.rail
    volts = _test_volts(view.board, index, 0.8)
    sound = np.maximum(0.002 * view.specimens.reservoir[index] * volts, 1e-6)
    return Shown(volts / view.specimens.reservoir_leak[index] + sound, 0.5 * sound)


def _rail_leakage(view: View) -> Shown:
    index = view.rail
    volts = _test_volts(view.board, index, 0.8)
    specimens, shape = view.specimens, view.specimens.shape
    alone = shape.rails[index].clamps_to < 0 and not (index == 0 and shape.zener_at_node)
    through = np.zeros(specimens.count)
    if alone:
        through, _ = branches.zener(np.full(specimens.count, volts), specimens.zener[index])
        through = through + volts / specimens.zener_short[index]
    value = volts / specimens.board_leak[index] + np.minimum(through, 1.0)
    return Shown(value, 0.05 * value + 5e-6)


INJECTION_CLAMP, INJECTION_OVER = 0.020, 1.2
"""Default current limit of rail-injection [A], and its voltage limit over the rail's nominal voltage; the case format."""
INJECTION_UNKNOWN = 12.0
"""Voltage limit where the rail has no nominal voltage [V]."""


def injection_limits(board: Board, check: Check) -> tuple[float, float]:
    """Current [A] and voltage [V] limit of a rail-injection, as stated or by default, never above the reservoir's rating."""
    rail = board.rails[0] if check.rail is None else board.rail(check.rail)
    nominal = nominal_voltage(board, rail)
    limit = check.limit or (INJECTION_UNKNOWN if nominal is None else INJECTION_OVER * nominal)
    rated = None if rail.reservoir is None else rail.reservoir.rated_voltage
    limit = limit if rated is None or check.limit is not None else min(limit, rated)
    return check.clamp or INJECTION_CLAMP, limit


def _injection(view: View) -> Shown:
    clamp, limit = injection_limits(view.board, view.check)
    volts = view.bench.injected(view.check.on or (), view.rail, clamp, limit, where=view.where)
    solved = np.isfinite(volts)
    value = np.where(solved, volts, limit / 2.0)
    return Shown(value, 0.003 * value + 0.02 + np.where(solved, 0.0, limit))


def _load_current(view: View) -> Shown:
    """From a bench supply at 90 % of the rail's voltage, across the load itself."""
    number = view.load
    load, specimens = view.board.loads[number], view.specimens
    foot = 0.0 if load.returns_to == "common" else _test_volts(view.board, view.board.rail_index(load.returns_to), 0.9)
    voltage = np.full(specimens.count, max(_test_volts(view.board, view.board.rail_index(load.rail), 0.9) - foot, 0.0))
    drawn = _branch(specimens, number, voltage) + voltage * specimens.load_excess[number]
    return Shown(np.where(specimens.load_open[number] == 0.0, drawn, 0.0), 0.02 * drawn)


def _branch(specimens: Specimens, number: int, voltage: Array) -> Array:
    kind = specimens.shape.loads[number].kind
    sink = branches.constant_current(voltage, specimens.load_current[number])[0]
    if kind in ("current", "gate"):
        return sink
    if kind == "led":
        return sink + branches.led(voltage, specimens.load_forward[number], specimens.load_resistance[number])[0]
    return sink + branches.resistor(voltage, specimens.load_resistance[number])[0]


def _coil(view: View) -> Shown:
    number = view.load
    specimens = view.specimens
    value = np.where(specimens.load_open[number] > 0.0, np.inf, specimens.load_resistance[number])
    return _resistance(value, 0.005)


def _switch(view: View) -> Shown:
    state = view.specimens.switch[view.load]
    return _three_words(np.asarray(state == Switch.OPEN), np.asarray(state == Switch.STUCK), ("good", "open", "short"))


def _tap(view: View) -> Shown:
    """A bad joint mostly shows itself when it is pressed; whether it then cuts out or comes back is an even chance."""
    bad = np.isinf(view.specimens.joint) | np.isinf(view.specimens.rail_joint).any(axis=0)
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
