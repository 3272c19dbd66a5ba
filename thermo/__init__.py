"""midradius.thermo"""
