"""What surrounds a spacecraft: sunlight, plasma, orbit.

Import the modules by name. Light and plasma: `spectrum`, `plasma`, `catalogue`. Orbit:
`trajectory` (the common interface and the geometry along it), `orbit`, `oem`,
`ephemeris_table`, `tle`, `timescales`. Sun, Moon and shadow: `sun`, `moon`, `eclipse`,
`magnetosphere`. Plasma along an orbit: `regions` (one module for each region behind it),
`activity`, `substorm`, `plasma_timeline`. Attitude: `attitude`, `pointing`, `attitude_file`,
`shadow_table`. `errors` holds the exception for data that cannot be used.
"""
