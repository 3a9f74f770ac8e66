"""The equations of state, one file each; ``van_der_waals.py`` is the one to learn from. No solving loops, no data."""
