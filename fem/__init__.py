"""midradius.fem"""
