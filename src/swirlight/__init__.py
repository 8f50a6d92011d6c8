"""swirlight: molecular liquids in pulsed, circularly polarised light."""

__version__ = "0.1.0"
