"""Floor 3: the design document, its requirements, and `assess`, the single source of every figure."""
