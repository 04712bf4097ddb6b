"""The instruments: what they state of themselves, and what is taken where they state nothing."""
