"""Real-gas density, compressibility factor and molar volume as a service.

Imports point down only: ``web`` -> ``service`` -> ``engine`` -> ``gases``; ``units`` and ``errors`` are leaves.
"""

__all__ = ["__version__"]

__version__ = "0.1.0"
