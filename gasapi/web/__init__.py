"""The edge of the service: requests into SI questions, answers into the caller's units and format.

With ``gasapi.app`` this is the only place that imports Flask and marshmallow. No thermodynamics here: a route loads a
question, asks the service, and writes the answer down.
"""
