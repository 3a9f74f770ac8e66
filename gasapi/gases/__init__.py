"""Gas data: frozen records, the loader that checks and hashes them, the catalogue that finds a gas by any of its names.

This layer imports nothing above it and computes no property of a gas. Quantities are SI and molar throughout.
"""
