"""Rigid bodies from lists of sites, and a library of them with their sources."""
