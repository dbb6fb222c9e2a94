"""Lifting surfaces: planform, lifting line, stall."""
