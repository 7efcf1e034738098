"""What surrounds a spacecraft: sunlight, plasma, orbit.

Import the modules by name. Light and plasma: `spectrum`, `plasma`, `catalogue`. Orbit:
`trajectory` (the common interface and the geometry along it), `orbit`, `oem`,
`ephemeris_table`, `tle`, `timescales`. Sun, Moon and shadow: `sun`, `moon`, `eclipse`,
`magnetosphere`. Attitude: `attitude`, `pointing`, `attitude_file`, `shadow_table`. `errors`
holds the exception for data that cannot be used.
"""
