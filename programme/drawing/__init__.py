"""Geometry of the drawings, once, for the screen (SVG) and for paper (reportlab)."""
