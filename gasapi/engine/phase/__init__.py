"""Which phase a state is in: saturation and sublimation curves, and the rules that turn them into a region.

Curves are immutable, built once for a gas and an equation of state, and give the same bits for a float and for an element
of an array. Verdicts come as numbers (``Region``, ``PhaseFlag``); wording is left to the layers above.
"""
