"""What the geologist asks: which plugs, and what they show."""
