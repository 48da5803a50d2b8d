"""The design that ``benchlog new`` writes and the demo measures: invented, and meant to be edited.

Its nominal board meets its own budget with room to spare (a test holds it to that).
"""

EXAMPLE_DESIGN = """\
# An invented design to start from: one non-inverting stage with a gain of 48 (33.62 dB).
# Parts are written as people do: "47k", "4k7", "22p"; every number carries its unit.

name = "line preamp"
revision = "A"
rails = ["-12 V", "12 V"]

[[stage]]                       # one table for each stage, in the order of the signal
topology = "non-inverting"      # follower | non-inverting | inverting | ...
feedback = "47k"
ground = "1k"
amplifier = "main"

[amplifier.main]                # from the data sheet
gbw = { min = "2 MHz", typical = "3 MHz", max = "4 MHz" }
open_loop_gain = "200k"
slew_rate = "13 V/us"
output_swing = "10.5 V"         # peak

[tolerance]
resistor = "1%"
capacitor = "10%"

[drive]
level = "20 mVpp"               # at the board's input

[budget]
rule = "four-state"             # simple | guarded | four-state | guarded-rejection
gain = { min = "33.3 dB", max = "33.9 dB" }
corner = { min = "40 kHz" }
gbw = { min = "2 MHz" }
peaking = { max = "1 dB" }
"""
