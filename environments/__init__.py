"""What surrounds a spacecraft: sunlight, plasma, orbit.

Import the modules by name: `spectrum`, `plasma`, `catalogue`, `orbit`, `sun`, `eclipse`,
`attitude`; `errors` holds the exception for data that cannot be used.
"""
