"""Outside checks: references written from the mathematics alone, in 60 digits, without the engine's numerics."""
