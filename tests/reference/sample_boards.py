"""The boards of the sample cases, as the text that goes into the files.

All are inventions. They are kept as case-file text, so that the file a reader opens and the board that is
simulated are the same words.
"""

PROOFER = """
[mains]
voltage = "230 V"
frequency = "50 Hz"

[board]
name = "proofer control, issue 3"
made = 2012
rectifier = "bridge"
ambient = "40 degC"

[board.fuse]
rated_current = "1 A"

[board.dropper]
kind = "capacitor"
capacitance = "680 nF"
tolerance = "10 %"
safety_class = "X2"
rated_voltage = "310 V"

[board.inrush]
resistance = "100 ohm"
rated_power = "2 W"
fusible = true

[board.bleeder]
resistance = "470 kohm"      # each of the two
in_series = 2
rated_voltage = "200 V"

[[board.rail]]
name = "relay rail"
short = "relay"
fed_by = "rectifier"
zener = { voltage = "18 V", tolerance = "5 %", rated_power = "1.3 W", clamps_to = "logic rail" }
reservoir = { capacitance = "220 uF", tolerance = "20 %", rated_voltage = "35 V" }

[[board.rail]]
name = "logic rail"
short = "logic"
fed_by = "relay rail"
fed_through = "zener"
zener = { voltage = "5.1 V", tolerance = "5 %", rated_power = "1 W" }
reservoir = { capacitance = "100 uF", tolerance = "20 %", rated_voltage = "10 V" }

[[board.load]]
name = "controller"
kind = "current"
rail = "logic rail"
current = "3.5 mA"

[[board.load]]
name = "heater relay"
kind = "coil"
rail = "relay rail"
returns_to = "logic rail"
switched = true
nominal_voltage = "18 V"
resistance = "810 ohm"
"""

TOWEL_RAIL = """
[mains]
voltage = "120 V"
frequency = "60 Hz"

[board]
name = "towel rail timer, two-layer board"
made = 2009
rectifier = "bridge"

[board.dropper]
kind = "capacitor"
capacitance = "820 nF"
safety_class = "X2"

[board.inrush]
resistance = "47 ohm"
rated_power = "1 W"

[board.bleeder]
resistance = "330 kohm"
in_series = 2

[[board.rail]]
name = "12 V rail"
fed_by = "rectifier"
zener = { voltage = "12 V", rated_power = "1.3 W" }
reservoir = { capacitance = "330 uF", rated_voltage = "25 V" }

[[board.load]]
name = "timer chip"
kind = "current"
rail = "12 V rail"
current = "3 mA"

[[board.load]]
name = "element relay"
kind = "coil"
rail = "12 V rail"
switched = true
nominal_voltage = "12 V"
resistance = "720 ohm"
"""

PUMP = """
[mains]
voltage = "230 V"
frequency = "50 Hz"

[board]
name = "cellar pump level switch"
made = 2015
rectifier = "half-wave"
connected_by = "fixed"

[board.fuse]
rated_current = "0.5 A"

[board.dropper]
kind = "capacitor"
capacitance = "1 uF"
safety_class = "X2"
rated_voltage = "305 V"

[board.inrush]
resistance = "220 ohm"
rated_power = "3 W"
fusible = true

[board.bleeder]
resistance = "180 kohm"
in_series = 2

[[board.rail]]
name = "15 V rail"
fed_by = "rectifier"
zener = { voltage = "15 V", rated_power = "1.3 W" }
reservoir = { capacitance = "470 uF", rated_voltage = "25 V" }

[[board.rail]]
name = "logic rail"
fed_by = "15 V rail"
fed_through = "resistor"
feed_resistance = "1.5 kohm"
zener = { voltage = "5.1 V", rated_power = "0.5 W" }
reservoir = { capacitance = "47 uF", rated_voltage = "16 V" }

[[board.load]]
name = "float logic"
kind = "current"
rail = "logic rail"
current = "2.5 mA"

[[board.load]]
name = "pump relay"
kind = "coil"
rail = "15 V rail"
switched = true
nominal_voltage = "15 V"
resistance = "1.1 kohm"
"""

FAN = """
[mains]
voltage = "120 V"
frequency = "60 Hz"

[board]
name = "attic fan thermostat"
rectifier = "half-wave-zener"
connected_by = "fixed"

[board.dropper]
kind = "capacitor"
capacitance = "1 uF"
safety_class = "X2"

[board.inrush]
resistance = "150 ohm"
rated_power = "2 W"

[board.bleeder]
resistance = "220 kohm"
in_series = 2

[[board.rail]]
name = "12 V rail"
fed_by = "rectifier"
zener = { voltage = "12 V", rated_power = "1 W" }
reservoir = { capacitance = "470 uF", rated_voltage = "25 V" }

[[board.load]]
name = "controller"
kind = "current"
rail = "12 V rail"
current = "3 mA"

[[board.load]]
name = "run lamp"
kind = "led"
rail = "12 V rail"
switched = true
forward_voltage = "2 V"
resistance = "1.5 kohm"
"""

SIGN = """
[mains]
voltage = "120 V"
frequency = "60 Hz"

[board]
name = "exit sign lamp board"
made = 2003
rectifier = "bridge"
connected_by = "fixed"

[board.dropper]
kind = "resistor"
resistance = "4.7 kohm"
rated_power = "7 W"

[[board.rail]]
name = "12 V rail"
fed_by = "rectifier"
zener = { voltage = "12 V", rated_power = "1 W" }
reservoir = { capacitance = "220 uF", rated_voltage = "25 V" }

[[board.load]]
name = "flasher"
kind = "current"
rail = "12 V rail"
current = "3 mA"

[[board.load]]
name = "sign lamp"
kind = "led"
rail = "12 V rail"
switched = true
forward_voltage = "2 V"
resistance = "1 kohm"
"""

HOOD = """
[mains]
voltage = "230 V"
frequency = "50 Hz"

[board]
name = "cooker hood control"
made = 2007
rectifier = "bridge"

[board.dropper]
kind = "capacitor"
capacitance = "470 nF"

[board.inrush]
resistance = "unknown"       # charred: the bands cannot be read
rated_power = "1 W"

[board.bleeder]
resistance = "470 kohm"
in_series = 2

[[board.rail]]
name = "12 V rail"
fed_by = "rectifier"
zener = { voltage = "12 V", rated_power = "1.3 W" }
reservoir = { capacitance = "470 uF", rated_voltage = "25 V" }

[[board.load]]
name = "touch controller"
kind = "current"
rail = "12 V rail"
current = "unknown"          # the chip carries a house number only

[[board.load]]
name = "lamp relay"
kind = "coil"
rail = "12 V rail"
switched = true
nominal_voltage = "12 V"
resistance = "720 ohm"
"""

SHUTTER = """
[mains]
voltage = "230 V"
frequency = "50 Hz"

[board]
name = "shutter drive, two relays"
made = 2014
rectifier = "bridge"
connected_by = "fixed"

[board.varistor]
voltage = "275 V"

[board.dropper]
kind = "capacitor"
capacitance = "680 nF"
safety_class = "X2"
dielectric = "polypropylene"

[board.inrush]
resistance = "100 ohm"
rated_power = "2 W"

[board.bleeder]
resistance = "330 kohm"
in_series = 2

[[board.rail]]
name = "24 V rail"
short = "24 V"
fed_by = "rectifier"
zener = { voltage = "24 V", rated_power = "1.3 W" }
reservoir = { capacitance = "220 uF", rated_voltage = "35 V" }

[[board.rail]]
name = "logic rail"
short = "logic"
fed_by = "24 V rail"
fed_through = "resistor"
feed_resistance = "3.3 kohm"
zener = { voltage = "5.1 V", rated_power = "0.5 W" }
reservoir = { capacitance = "100 uF", rated_voltage = "16 V" }

[[board.load]]
name = "receiver"
kind = "current"
rail = "logic rail"
current = "3.5 mA"

[[board.load]]
name = "up relay"
kind = "coil"
rail = "24 V rail"
switched = true
nominal_voltage = "24 V"
resistance = "2.304 kohm"

[[board.load]]
name = "down relay"
kind = "coil"
rail = "24 V rail"
switched = true
nominal_voltage = "24 V"
resistance = "2.304 kohm"
"""

BOARDS = {
    "proofer": PROOFER,
    "towel rail": TOWEL_RAIL,
    "pump": PUMP,
    "fan": FAN,
    "sign": SIGN,
    "hood": HOOD,
    "shutter": SHUTTER,
}
