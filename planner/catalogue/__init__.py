"""The gas catalogue: what a planner must know beside the spectrum."""
