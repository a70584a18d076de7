"""Loopwright's engine: models, the loop, and the assessment of a design. It knows no web, disk or clock."""
