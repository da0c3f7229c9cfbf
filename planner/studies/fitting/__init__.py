"""The parts of a fit to a user's spectrum: what was observed, what is unknown, how likely, what came out."""
