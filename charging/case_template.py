"""The commented case that ``halflit case new`` prints: a small fictional satellite."""

CASE_TEMPLATE = """\
# A case for halflit: one spacecraft, one orbit, the plasma around it.
# Check it with 'halflit case check', run it with 'halflit run'.
# A key carries its unit (thickness_m = 127e-6) or is bare with a text (thickness = "5 mil").

title = "Three surfaces, a day at equinox with one substorm"

[orbit]                               # or kind = "fixed": illumination, sun_direction, duration_h
kind = "kepler"
center = "earth"
epoch = 2031-03-20T00:00:00Z          # start of the run, UTC with Z
semi_major_axis_km = 42164.17
eccentricity = 0.0002
inclination_deg = 0.05
raan_deg = 0.0
argument_of_perigee_deg = 0.0
mean_anomaly_deg = 0.0

[time]
duration_h = 24.0
output_step_s = 60.0
start = "uncharged"                   # or "equilibrium"

[sun]
f107 = 150.0                          # 10.7 cm radio flux; f107_81day defaults to it
absorbing_height_km = 0.0             # air that absorbs the ultraviolet, above the ground

[attitude]
law = "nadir"                         # +z to the Earth, +x along velocity, so +y is south

[plasma]
use = "quiet geostationary"           # all names: halflit plasmas; or a file, "mine.toml"
# accept_assumed = "why plasmas of assumed figures may carry a verdict"

[[plasma.event]]                      # mixed in: linear rise, hold, exponential decay
onset = 2031-03-20T11:30:00Z          # or onset_h, hours from the start
rise_min = 5.0
hold_min = 40.0
decay_min = 30.0
use = "substorm, 3 keV class"

[body]
radius_m = 1.2                        # sphere of the same size
collection = "auto"                   # or "sphere", "plane", "cylinder"

[emission]
secondary_law = "both"                # the verdict takes the worse of two laws

[[surface]]
name = "bus panel"
material = "oxidised aluminium"       # all names: halflit materials; or a file, "mine.toml"
area_m2 = 4.0
normal = [0.0, 0.0, 1.0]              # outward, body axes
neighbours = ["south radiator"]

[[surface]]
name = "south radiator"
material = "FEP film, silvered"
area_m2 = 2.5
thickness = "5 mil"                   # a surface with a thickness is a dielectric
normal = [0.0, 1.0, 0.0]
attached_to = "structure"             # or an isolated conductor (floating = true, capacitance_F)
neighbours = ["bus panel"]
temperature_K = 255.0

[[surface]]
name = "solar cells"
material = "cover glass"
area_m2 = 6.0
thickness_m = 100e-6
tracks_sun = true                     # turns about y; instead of a normal
side = "front"                        # or "back"
temperature_K = {sunlit_K = 325.0, eclipse_K = 200.0, time_constant_min = 15.0}

# [[link]]                            # a resistor between two conductors
# between = ["an isolated conductor", "structure"]
# resistance_ohm = 1e6

[[mode]]                              # the whole run again, with these changes
name = "solar maximum"
alternative = true
f107 = 220.0

# [[limit]]                           # replaces the default limit of its kind
# kind = "normal"                     # or "inverted"; or "field" with allowed_V_m
# allowed_V = 400.0
# requirement_id = "CHG-010"
# source_document = "the project's own specification"
# clause = "4.2"
# margin_policy = {factor = 1.25, basis = "project rule"}
# reason = "why it differs from the default"

[review]
plasmas = ["ECSS geostationary worst case"]
ages = ["begin", "end"]
"""
