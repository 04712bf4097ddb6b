"""File formats: rows in and rows out, without knowledge of what they mean."""
