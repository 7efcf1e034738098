"""Currents of one surface in one plasma: collection, emission, escape, balance."""
