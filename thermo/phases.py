"""The constituents and their order along the phase axis.

Every array with a phase axis has the shape ``(n_phase, n_node)`` or
``(n_time, n_phase, n_node)`` in this order. "Cementite" is the proeutectoid
one; the cementite inside pearlite and bainite counts there.
"""

AUSTENITE, FERRITE, CEMENTITE, PEARLITE, BAINITE, MARTENSITE = range(6)
PHASE_NAMES = ("austenite", "ferrite", "cementite", "pearlite", "bainite", "martensite")
N_PHASE = len(PHASE_NAMES)
