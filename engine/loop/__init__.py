"""Floor 1: the closed loop and every reading taken from it. Knows models, never documents."""
