"""A whole configuration, for the tests that read, break or store one."""

FRONT = """\
title = "Does the front over Sarn Bank settle or radiate?"      # an invented place
question = "How wide is what stays of a step in a thin light layer?"

[frame]
body = "earth"
latitude = "45 deg"
plane = "f"

[layer]
depth = "100 m"
reduced_gravity = "0.02 m/s^2"      # one light layer over a deep resting one

[grid]
cells = [1024, 4]
size = ["550 km", "2148.4375 m"]
origin = "centre"                   # where x = y = 0 lies: "centre" or "corner" (south-west)
precision = "double"                # or "single"

[edges]
west = "wall"
east = "wall"
south = "periodic"
north = "periodic"

[[start]]
kind = "formula"
eta = "0.5 * sign(x)"               # m; also u, v in m/s; what is not given is 0

[numerics]
pv_flux = "both"
linear = true

[time]
stepper = "ssprk3"
until = "3.6 day"

[output]
every = "1 h"
fields = ["eta", "u", "v"]          # also "h", "pv", "vorticity", "divergence", "speed"
diagnostics_every = "1 h"

[[expect]]
claim = "What stays is one deformation radius wide"
measure = { kind = "decay_length", of = "eta", along = "x", from = 0, to = "70 km", during = ["2.2 day", "3.6 day"] }
value = "deformation_radius"
within = "8 %"
because = "26 cells a radius; two inertial periods leave some 4 % of doubt"
"""


def changed(*edits: tuple[str, str]) -> str:
    """Return the configuration with texts exchanged, each of which must stand in it."""
    text = FRONT
    for old, new in edits:
        assert old in text, old
        text = text.replace(old, new, 1)
    return text
