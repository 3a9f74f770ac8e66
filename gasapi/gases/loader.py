"""Data files to records: the one place where the rest of the program asks for them.

Every file is checked member by member as it is read, and a fault is a ``DataError`` that names file and key. Results are
immutable and are kept, so that a second call costs nothing.
"""

from __future__ import annotations

from gasapi.gases.data_files import data_files, data_hash, hash_of_files
from gasapi.gases.equation_files import load_gerg, load_reference, reference_ids
from gasapi.gases.interaction_file import load_interaction
from gasapi.gases.substance_files import load_blends, load_substances
from gasapi.gases.uncertainty_file import load_generalised_uncertainty

__all__ = [
    "data_files",
    "data_hash",
    "hash_of_files",
    "load_blends",
    "load_generalised_uncertainty",
    "load_gerg",
    "load_interaction",
    "load_reference",
    "load_substances",
    "reference_ids",
]
