"""midradius.study"""
