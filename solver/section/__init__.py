"""The flow about one section (two-dimensional)."""
