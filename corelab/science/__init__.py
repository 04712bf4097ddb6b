"""Formulas and estimators: NumPy arrays in, arrays out; no table, file or screen is known here."""
