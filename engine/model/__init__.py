"""Floor 0: what a plant, a sensor or a stage is. Knows numpy, scipy and mpmath, nothing above it."""
