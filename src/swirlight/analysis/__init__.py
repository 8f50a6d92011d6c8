"""Pure functions of arrays: correlations, spectra, statistics. No files."""
