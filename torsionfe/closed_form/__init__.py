"""Closed forms: exact solids, the sum of thin plates, thin-walled cells."""
