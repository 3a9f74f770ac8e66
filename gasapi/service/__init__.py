"""The service: one file, one question. Questions come in SI, answers go out in SI; no request, no JSON, no units.

A question is resolved (which gas), selected (which equation), solved, classified (which phase) and judged (which quality).
Nothing here evaluates an equation itself; the engine does.
"""
