"""Geometry of the spacecraft: panels, field, shadow, picture."""
