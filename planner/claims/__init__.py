"""Claims: somebody's statement that a gas was seen, as it was published, and the spectrum that goes with it."""
