"""The engine: equations of state, density solvers and phase, as pure functions of floats and arrays.

Everything is SI and molar (K, Pa, mol/m3, J/mol/K, kg/mol). Nothing here reads a file, a clock or the environment, logs,
caches between calls or knows of HTTP. What it imports from ``gasapi.gases`` are the frozen records that hold coefficients.

Every public routine takes a Python ``float`` or a one-dimensional ``float64`` array and gives the same bits for a number
whichever way it comes: see ``gasapi.engine.elementary`` for the rule that makes this so.
"""
