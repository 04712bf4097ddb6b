"""The bench: taking in sheets, and reducing readings to results."""
