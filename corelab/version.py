"""The version of the program, as every event and export records it."""

__version__ = "0.1.0"
