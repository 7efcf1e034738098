"""Limits, margins and verdicts."""
