"""Which shapes, loads and faults `wide_circuits` draws, one circuit a row, and the published statements.

A row is rectifier, dropper, layout of rails, loads, share of the wanted current that the dropper is chosen
to give, and the fault ("fault@place=value + second fault"). Loads by letter: c controller, x a controller
that sleeps (light load), k coil to the rail below, K coil to common, r resistor, l LED on the last rail, L
LED on the main rail, g gate on the last rail, G gate on the main rail. Every third circuit is on 230 V
50 Hz, 120 V 60 Hz, 240 V 50 Hz in turn; in every fifth the switched loads are off.
"""

from __future__ import annotations

from typing import Any

from tests.reference.parts import METER

BR, HW, HZ = "bridge", "half-wave", "half-wave-zener"
CA, RE, DI = "capacitor", "resistor", "divider"
MAIN, LOGIC, LOW = "@main rail", "@logic rail", "@low rail"

PLAN: tuple[tuple[str, str, str, str, float, str], ...] = (
    # healthy, every shape
    (BR, CA, "single", "ckl", 1.5, "no-fault"),
    (BR, CA, "stacked", "ck", 0.7, "no-fault"),
    (BR, CA, "three levels", "ckL", 1.5, "no-fault"),
    (HW, CA, "single", "ckg", 1.5, "no-fault"),
    (HW, CA, "three levels", "ckl", 1.4, "no-fault"),
    (HW, CA, "stacked", "xk", 0.8, "no-fault"),
    (HZ, CA, "single", "cKr", 1.3, "no-fault"),
    (HZ, CA, "resistor", "cLg", 0.8, "no-fault"),
    (HZ, CA, "regulator", "cKl", 1.4, "no-fault"),
    (BR, RE, "single", "ckl", 1.3, "no-fault"),
    (BR, RE, "resistor", "xLg", 1.3, "no-fault"),
    (HW, RE, "single", "cLr", 0.7, "no-fault"),
    (HW, RE, "regulator", "xL", 1.5, "no-fault"),
    (HW, RE, "stacked", "xLg", 1.4, "no-fault"),
    (BR, DI, "single", "ck", 1.5, "no-fault"),
    (BR, DI, "stacked", "ckl", 0.7, "no-fault"),
    (BR, DI, "regulator", "xg", 1.4, "no-fault"),
    (HW, DI, "single", "ckr", 1.4, "no-fault"),
    (HW, DI, "resistor", "cL", 0.8, "no-fault"),
    (HZ, DI, "single", "cK", 1.5, "no-fault"),
    (BR, CA, "regulator", "cKg", 1.5, "no-fault"),
    (BR, CA, "regulator", "cKl", 0.6, "no-fault"),
    (HW, CA, "regulator", "ckL", 0.8, "no-fault"),
    (BR, CA, "stacked, resistor", "ckl", 1.4, "no-fault"),
    (BR, CA, "stacked, regulator", "ckg", 0.8, "no-fault"),
    (HW, CA, "resistor, regulator", "cKg", 1.4, "no-fault"),
    (BR, CA, "regulator, resistor", "cKr", 1.3, "no-fault"),
    (BR, CA, "resistor, resistor", "ckG", 0.8, "no-fault"),
    (HW, CA, "resistor", "cKG", 1.4, "no-fault"),
    (BR, CA, "resistor", "clr", 2.2, "no-fault"),
    # dropper
    (BR, CA, "single", "ck", 1.5, "dropper-capacitance-lost"),
    (HW, CA, "stacked", "ckl", 1.5, "dropper-capacitance-lost"),
    (HZ, CA, "single", "cK", 1.5, "dropper-capacitance-lost"),
    (BR, DI, "single", "ckg", 1.5, "dropper-capacitance-lost"),
    (BR, CA, "regulator", "cK", 1.5, "dropper-capacitance-lost"),
    (BR, CA, "resistor", "cK", 1.5, "wrong-part"),
    (BR, CA, "single", "xk", 1.5, "dropper-open"),
    (HW, CA, "resistor", "xK", 1.5, "dropper-open"),
    # mains path
    (BR, CA, "single", "ck", 1.5, "inrush-high"),
    (HW, CA, "stacked", "ck", 1.5, "inrush-high"),
    (BR, CA, "single", "xL", 1.5, "inrush-high=15000"),
    (HW, CA, "resistor", "cK", 1.5, "inrush-high=15000"),
    (HZ, CA, "single", "cK", 1.5, "inrush-high"),
    (BR, RE, "single", "cL", 1.4, "inrush-high=6800"),
    (BR, CA, "stacked", "ck", 1.5, "inrush-open"),
    (HW, DI, "single", "ck", 1.5, "joint-open"),
    (BR, CA, "single", "ck", 1.5, "bleeder-open"),
    (HW, CA, "single", "ck", 1.5, "bleeder-low"),
    # rectifier
    (BR, CA, "single", "ck", 1.5, "diode-open@top-a"),
    (BR, CA, "stacked", "xk", 1.5, "diode-open@bottom-b"),
    (HW, CA, "single", "ck", 1.5, "diode-open@return"),
    (HW, CA, "resistor", "cK", 1.5, "diode-open@series"),
    (BR, RE, "single", "cL", 1.4, "diode-open@top-b"),
    (BR, CA, "stacked", "ck", 1.5, "diode-short@top-a"),
    (BR, CA, "single", "xL", 1.5, "diode-short@bottom-a"),
    (HW, CA, "single", "ck", 1.5, "diode-short@series"),
    (HW, CA, "stacked", "xk", 1.5, "diode-short@return"),
    (HZ, CA, "single", "cK", 1.5, "diode-short@series"),
    (BR, DI, "single", "ck", 1.5, "diode-short@bottom-b"),
    # zeners
    (BR, CA, "single", "xk", 1.5, "zener-open" + MAIN),
    (BR, CA, "stacked", "ck", 1.5, "zener-open" + LOW),
    (HW, CA, "resistor", "cK", 1.5, "zener-open" + LOGIC),
    (HZ, CA, "single", "cK", 1.5, "zener-open" + MAIN),
    (HW, CA, "stacked", "ck", 1.5, "zener-open" + MAIN),
    (BR, RE, "single", "xL", 1.5, "zener-open" + MAIN),
    (BR, CA, "single", "ck", 1.5, "zener-short" + MAIN),
    (HW, CA, "stacked", "ck", 1.5, "zener-short" + LOW),
    (BR, CA, "resistor", "cK", 1.5, "zener-short" + LOGIC),
    (HZ, CA, "single", "cK", 1.5, "zener-short" + MAIN),
    (BR, CA, "three levels", "ck", 1.5, "zener-short@middle rail"),
    (BR, CA, "single", "ck", 1.5, "zener-low" + MAIN),
    (HW, CA, "stacked", "ckl", 1.5, "zener-low" + LOW),
    (HZ, CA, "resistor", "cK", 1.5, "zener-low" + MAIN),
    (BR, DI, "resistor", "cK", 1.5, "zener-low" + LOGIC),
    # reservoirs and leaks
    (BR, CA, "single", "ck", 1.5, "reservoir-dried" + MAIN),
    (HW, CA, "single", "ck", 1.3, "reservoir-dried" + MAIN),
    (HW, CA, "regulator", "cK", 1.4, "reservoir-dried" + MAIN),
    (BR, CA, "stacked", "ck", 1.4, "reservoir-dried" + LOW),
    (HZ, CA, "single", "cK", 1.5, "reservoir-dried" + MAIN),
    (BR, CA, "single", "cL", 1.4, "joint-open" + MAIN),
    (BR, RE, "single", "cL", 1.3, "reservoir-dried" + MAIN),
    (BR, CA, "single", "ck", 1.5, "reservoir-leaky" + MAIN),
    (HW, CA, "resistor", "cK", 1.5, "reservoir-leaky" + LOGIC),
    (HZ, CA, "single", "cK", 1.5, "reservoir-leaky" + MAIN),
    (BR, CA, "stacked", "ck", 1.5, "board-leakage" + LOW),
    (HW, CA, "single", "xk", 1.5, "board-leakage" + MAIN),
    (BR, CA, "regulator", "cK", 1.5, "board-leakage" + LOGIC),
    # feeds
    (BR, CA, "resistor", "cK", 1.4, "feed-open" + LOGIC),
    (HW, CA, "regulator", "cK", 1.4, "feed-open" + LOGIC),
    (BR, CA, "stacked, resistor", "ck", 1.4, "feed-open" + LOGIC),
    (BR, CA, "resistor", "cK", 1.4, "feed-high" + LOGIC),
    (HW, CA, "resistor", "cKg", 1.4, "feed-high" + LOGIC),
    (BR, CA, "resistor, regulator", "cK", 1.4, "feed-high@middle rail"),
    (BR, CA, "resistor", "cK", 1.4, "feed-short" + LOGIC),
    (HW, CA, "resistor", "cK", 1.4, "feed-short" + LOGIC),
    (BR, CA, "resistor, resistor", "cK", 1.4, "feed-short@middle rail"),
    # loads and switches
    (BR, CA, "single", "ck", 1.5, "load-excess@controller"),
    (HW, CA, "resistor", "cK", 1.5, "load-excess@controller"),
    (BR, DI, "stacked", "ckl", 1.5, "load-excess@lamp"),
    (BR, CA, "stacked", "ckl", 1.5, "load-open@controller"),
    (HZ, CA, "single", "cK", 1.5, "load-open@relay"),
    (HW, CA, "regulator", "cK", 1.5, "load-open@controller"),
    (BR, CA, "single", "ck", 1.4, "coil-shorted-turns@relay"),
    (HW, CA, "stacked", "ck", 1.4, "coil-shorted-turns@relay"),
    (BR, CA, "regulator", "cK", 1.4, "coil-shorted-turns@relay"),
    (BR, CA, "stacked", "ck", 1.4, "switch-open@relay"),
    (HZ, CA, "single", "cL", 1.4, "switch-open@display"),
    (BR, CA, "single", "ck", 1.4, "coil-open@relay"),
    (BR, CA, "single", "ck", 0.8, "switch-stuck-on@relay"),
    (HW, CA, "stacked", "ckl", 1.4, "switch-stuck-on@lamp"),
    (HW, CA, "regulator", "cKG", 1.4, "switch-stuck-on@relay"),
    # mains
    (BR, CA, "stacked", "ck", 1.2, "mains-low"),
    (HW, CA, "single", "ck", 1.2, "mains-low"),
    (HZ, RE, "single", "cL", 1.3, "mains-low"),
    (BR, CA, "single", "ck", 1.2, "mains-high"),
    (BR, DI, "single", "ck", 1.2, "mains-high"),
    (HW, CA, "regulator", "cK", 1.2, "mains-high"),
    # second capacitor
    (BR, DI, "single", "ck", 1.4, "shunt-capacitor-lost"),
    (HW, DI, "stacked", "ck", 1.4, "shunt-capacitor-lost"),
    (HZ, DI, "single", "cK", 1.4, "shunt-capacitor-lost"),
    (BR, DI, "resistor", "cK", 1.4, "shunt-capacitor-open"),
    (HW, DI, "single", "ck", 1.4, "shunt-capacitor-open"),
    (BR, DI, "single", "ck", 1.4, "shunt-capacitor-short"),
    (HW, DI, "single", "ck", 1.4, "shunt-capacitor-short"),
    # named pairs
    (BR, CA, "single", "ck", 1.4, "dropper-short + inrush-open"),
    (HW, CA, "stacked", "ck", 1.4, "dropper-short + fuse-open"),
    (BR, CA, "single", "ck", 1.4, "dropper-short + zener-short" + MAIN),
    (HW, CA, "single", "ck", 1.4, "dropper-short + zener-short" + MAIN),
    (BR, CA, "single", "ck", 1.4, "varistor-short + fuse-open"),
    (BR, CA, "single", "cL", 1.4, "zener-open@main rail + reservoir-leaky" + MAIN),
    (HW, CA, "single", "cL", 1.4, "zener-open@main rail + reservoir-leaky" + MAIN),
    (BR, CA, "single", "cL", 1.4, "zener-open@main rail + load-excess@controller"),
    (HW, CA, "resistor", "cL", 1.4, "zener-open@main rail + load-excess@controller"),
    (BR, CA, "single", "ck", 1.5, "dropper-capacitance-lost + reservoir-dried" + MAIN),
    (HW, CA, "single", "ck", 1.5, "dropper-capacitance-lost + reservoir-dried" + MAIN),
    (BR, CA, "stacked", "ck", 1.5, "dropper-capacitance-lost + reservoir-dried" + LOW),
)


def _stated(
    name: str, volts: float, rectifier: str, farads: float, zener: float, fault: dict[str, Any], amps: float
) -> dict[str, Any]:
    """Return a one-rail board of a statement, with one current load."""
    rail = {"name": "main rail", "fed_by": "rectifier", "zener": {"voltage": zener}}
    load = {"name": "controller", "kind": "current", "rail": "main rail", "switched": False, "current": amps}
    board = {
        "rectifier": rectifier,
        "inrush": {"resistance": 100.0},
        "dropper": {"kind": "capacitor", "capacitance": farads},
        "rail": [rail | {"reservoir": {"capacitance": 470e-6}}],
        "load": [load],
    }
    mains = {"voltage": volts, "frequency": 50.0}
    return {"name": name, "mains": mains, "board": board, "on": [], "meter": METER, "fault": fault}


_DRIED = {"fault": "reservoir-dried", "rail": "main rail", "factor": 10.0 / 470.0, "extra_esr": 1.0}
_OPEN = {"fault": "zener-open", "rail": "main rail"}
STATEMENTS: tuple[dict[str, Any], ...] = (
    # 470 nF gives 14.9 mA on 15 V; 7.4 mA is half of it
    _stated("a: half-wave, 10 uF left, half the current", 230.0, HW, 470e-9, 15.0, _DRIED, 7.4e-3),
    _stated("b: bridge, zener open, light load", 230.0, BR, 470e-9, 18.0, _OPEN, 1.5e-3),
    _stated("b: bridge, zener open, heavier load", 230.0, BR, 470e-9, 18.0, _OPEN, 5e-3),
    # the published figures name mains and current only; 1.65 uF is assumed, see test_reference_wide
    _stated("c: half-wave, zener open, 15 mA", 240.0, HW, 1.65e-6, 24.0, _OPEN, 15e-3),
    _stated("c: half-wave, zener open, nearly unloaded", 240.0, HW, 1.65e-6, 24.0, _OPEN, 0.6e-3),
    _stated("d: bridge diode open, no bleeder", 230.0, BR, 470e-9, 18.0,
            {"fault": "diode-open", "junction": "bottom-a"}, 3e-3),
)  # fmt: skip
