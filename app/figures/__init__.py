"""Bokeh figures, built once and then fed."""
