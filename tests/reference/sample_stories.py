"""What is wrong in each sample case and what the technician measured, in order.

`hidden` holds the true values of parts that the file calls unknown. A reading without `value` is taken from
the simulation; one with `value` is a word that the technician noted.
"""

from typing import Any

RELAY, BOTH = ["heater relay"], ["up relay", "down relay"]

STORIES: list[dict[str, Any]] = [
    {
        "file": "proofer-healthy", "board": "proofer", "number": "R-2201", "received": "2026-10-12",
        "appliance": "bread-proofing cabinet", "complaint": "none: measured after a service, for comparison",
        "story": "A sound board, measured as a yardstick for its sisters.",
        "fault": {"fault": "no-fault"},
        "readings": [
            {"what": "rail-voltage", "rail": "relay rail", "on": []},
            {"what": "rail-voltage", "rail": "relay rail", "on": RELAY},
            {"what": "rail-voltage", "rail": "logic rail", "on": RELAY},
            {"what": "load-responds", "load": "heater relay", "value": "yes"},
            {"what": "bleeder-resistance"},
            {"what": "dropper-capacitance", "lifted": True},
        ],
    },
    {
        "file": "proofer-relay-lets-go", "board": "proofer", "number": "R-2207", "received": "2026-10-14",
        "appliance": "bread-proofing cabinet", "complaint": "relay lets go after a minute",
        "story": "The cabinet heats for a minute, then the relay lets go; at rest the rail looks right.",
        "fault": {"fault": "dropper-capacitance-lost", "capacitance": 181.6e-9},
        "readings": [
            {"what": "rail-voltage", "rail": "relay rail", "on": []},
            {"what": "rail-voltage", "rail": "relay rail", "on": RELAY},
            {"what": "rail-voltage", "rail": "logic rail", "on": RELAY},
            {"what": "dropper-capacitance", "lifted": True},
        ],
    },
    {
        "file": "towel-rail-relay-buzzes", "board": "towel rail", "number": "R-2212",
        "received": "2026-10-15",
        "appliance": "heated towel rail", "complaint": "relay buzzes, rail stays cold",
        "story": "The relay only buzzes. Mains and bleeder were ruled out first.",
        "fault": {"fault": "dropper-capacitance-lost", "capacitance": 318e-9},
        "readings": [
            {"what": "mains-voltage"},
            {"what": "rail-voltage", "rail": "12 V rail", "on": []},
            {"what": "rail-voltage", "rail": "12 V rail", "on": ["element relay"]},
            {"what": "inrush-voltage", "on": ["element relay"]},
            {"what": "reservoir-esr", "rail": "12 V rail"},
        ],
    },
    {
        "file": "pump-dead", "board": "pump", "number": "R-2215", "received": "2026-10-19",
        "appliance": "cellar pump", "complaint": "completely dead after a thunderstorm",
        "story": "No sign of life. The fuse is good, so the path was followed from the plug inwards.",
        "fault": {"fault": "inrush-open"},
        "readings": [
            {"what": "look", "value": "nothing seen"},
            {"what": "fuse-resistance"},
            {"what": "path-resistance", "value": "open"},
            {"what": "inrush-resistance", "value": "open"},
            {"what": "dropper-capacitance", "lifted": True},
        ],
    },
    {
        "file": "pump-float-ignored", "board": "pump", "number": "R-2218", "received": "2026-10-20",
        "appliance": "cellar pump", "complaint": "does not react to the float",
        "story": "The float does nothing although the first rail stands where it should.",
        "fault": {"fault": "feed-open", "rail": "logic rail"},
        "readings": [
            {"what": "rail-voltage", "rail": "15 V rail", "on": []},
            {"what": "rail-voltage", "rail": "logic rail", "on": []},
            {"what": "load-responds", "load": "pump relay", "value": "no"},
            {"what": "feed-resistance", "rail": "logic rail", "value": "open"},
        ],
    },
    {
        "file": "fan-never-starts", "board": "fan", "number": "R-2221", "received": "2026-10-21",
        "appliance": "attic fan", "complaint": "never starts, no lamp",
        "story": "Line current flows as it should, yet there is next to nothing on the rail.",
        "fault": {"fault": "zener-short", "rail": "12 V rail", "resistance": 2.4},
        "readings": [
            {"what": "rail-voltage", "rail": "12 V rail", "on": []},
            {"what": "inrush-voltage", "on": []},
            {"what": "reservoir-capacitance", "rail": "12 V rail"},
            {"what": "zener-test", "rail": "12 V rail", "value": "short"},
        ],
    },
    {
        "file": "fan-lamp-dark", "board": "fan", "number": "R-2224", "received": "2026-10-22",
        "appliance": "attic fan", "complaint": "lamp dark, fan does not run",
        "story": "Dead as well, but on this one hardly any line current flows.",
        "fault": {"fault": "dropper-open"},
        "readings": [
            {"what": "mains-voltage"},
            {"what": "rail-voltage", "rail": "12 V rail", "on": []},
            {"what": "inrush-voltage", "on": []},
            {"what": "inrush-resistance"},
            {"what": "dropper-capacitance", "lifted": True, "value": "open"},
        ],
    },
    {
        "file": "sign-lamp-dim", "board": "sign", "number": "R-2230", "received": "2026-10-26",
        "appliance": "exit sign", "complaint": "lamp dim and getting dimmer",
        "story": "A resistor drops the mains. The rail sags; the reservoir was tested alone.",
        "fault": {"fault": "reservoir-leaky", "rail": "12 V rail", "current": 19e-3},
        "readings": [
            {"what": "rail-voltage", "rail": "12 V rail", "on": []},
            {"what": "rail-voltage", "rail": "12 V rail", "on": ["sign lamp"]},
            {"what": "dropper-voltage", "on": ["sign lamp"]},
            {"what": "reservoir-capacitance", "rail": "12 V rail"},
            {"what": "reservoir-leakage", "rail": "12 V rail"},
        ],
    },
    {
        "file": "sign-flickers", "board": "sign", "number": "R-2233", "received": "2026-10-27",
        "appliance": "exit sign", "complaint": "flickers, then stays half dark",
        "story": "The sister of the dim sign: here the reservoir is sound.",
        "fault": {"fault": "load-excess", "load": "flasher", "current": 17e-3},
        "readings": [
            {"what": "rail-voltage", "rail": "12 V rail", "on": ["sign lamp"]},
            {"what": "reservoir-leakage", "rail": "12 V rail"},
            {"what": "reservoir-esr", "rail": "12 V rail"},
            {"what": "load-current", "load": "flasher"},
        ],
    },
    {
        "file": "hood-lamp-stays-off", "board": "hood", "number": "R-2236", "received": "2026-10-28",
        "appliance": "cooker hood", "complaint": "fan works, lamp stays off",
        "story": "Two parts of this board are unknown. The rail does not notice the lamp being switched on.",
        "hidden": {"inrush": 100.0, "touch controller": 3.2e-3},
        "fault": {"fault": "coil-open", "load": "lamp relay"},
        "readings": [
            {"what": "rail-voltage", "rail": "12 V rail", "on": []},
            {"what": "rail-voltage", "rail": "12 V rail", "on": ["lamp relay"]},
            {"what": "load-responds", "load": "lamp relay", "value": "no"},
            {"what": "inrush-resistance"},
            {"what": "coil-resistance", "load": "lamp relay", "value": "open"},
        ],
    },
    {
        "file": "hood-lamp-drops-out", "board": "hood", "number": "R-2237", "received": "2026-10-28",
        "appliance": "cooker hood", "complaint": "lamp drops out when the kitchen is warm",
        "story": "Same board, same two unknown parts; nothing was lifted.",
        "hidden": {"inrush": 100.0, "touch controller": 3.2e-3},
        "fault": {"fault": "dropper-capacitance-lost", "capacitance": 226e-9},
        "readings": [
            {"what": "rail-voltage", "rail": "12 V rail", "on": []},
            {"what": "rail-voltage", "rail": "12 V rail", "on": ["lamp relay"]},
            {"what": "load-current", "load": "touch controller"},
            {"what": "line-current", "on": ["lamp relay"]},
        ],
    },
    {
        "file": "hood-checked-before-sale", "board": "hood", "number": "R-2239", "received": "2026-10-29",
        "appliance": "cooker hood", "complaint": "none: checked before it is sold on",
        "story": "Everything works. One dead reading nevertheless matters to whoever pulls the plug.",
        "hidden": {"inrush": 100.0, "touch controller": 3.2e-3},
        "fault": {"fault": "bleeder-open"},
        "readings": [
            {"what": "rail-voltage", "rail": "12 V rail", "on": ["lamp relay"]},
            {"what": "load-responds", "load": "lamp relay", "value": "yes"},
            {"what": "dropper-capacitance", "lifted": True},
            {"what": "reservoir-esr", "rail": "12 V rail"},
            {"what": "bleeder-resistance", "value": "open"},
        ],
    },
    {
        "file": "shutter-chatters", "board": "shutter", "number": "R-2241", "received": "2026-11-02",
        "appliance": "roller shutter", "complaint": "relays chatter",
        "story": "Both relays chatter; the mean voltage alone does not look that bad.",
        "fault": {"fault": "reservoir-dried", "rail": "24 V rail", "factor": 0.05, "extra_esr": 9.0},
        "readings": [
            {"what": "rail-voltage", "rail": "24 V rail", "on": BOTH},
            {"what": "rail-ripple", "rail": "24 V rail", "on": BOTH},
            {"what": "rail-ripple-rms", "rail": "24 V rail", "on": BOTH},
            {"what": "reservoir-esr", "rail": "24 V rail"},
            {"what": "reservoir-capacitance", "rail": "24 V rail"},
        ],
    },
    {
        "file": "shutter-weak", "board": "shutter", "number": "R-2244", "received": "2026-11-03",
        "appliance": "roller shutter", "complaint": "stops half way when both relays are on",
        "story": "Weak with both relays on, though the dropper measures right.",
        "fault": {"fault": "diode-short", "junction": "bottom-a"},
        "readings": [
            {"what": "rail-voltage", "rail": "24 V rail", "on": []},
            {"what": "rail-voltage", "rail": "24 V rail", "on": BOTH},
            {"what": "inrush-voltage", "on": BOTH},
            {"what": "dropper-capacitance", "lifted": True},
            {"what": "rectifier-test", "value": "short"},
        ],
    },
    {
        "file": "shutter-goes-down-only", "board": "shutter", "number": "R-2246", "received": "2026-11-04",
        "appliance": "roller shutter", "complaint": "goes down, not up",
        "story": "One direction is missing; its relay is sound.",
        "fault": {"fault": "switch-open", "load": "up relay"},
        "readings": [
            {"what": "rail-voltage", "rail": "24 V rail", "on": ["up relay"]},
            {"what": "load-responds", "load": "up relay", "value": "no"},
            {"what": "load-responds", "load": "down relay", "value": "yes"},
            {"what": "coil-resistance", "load": "up relay"},
            {"what": "switch-test", "load": "up relay", "value": "open"},
        ],
    },
]  # fmt: skip
