"""Figures and pages; matplotlib is imported when something is drawn."""
