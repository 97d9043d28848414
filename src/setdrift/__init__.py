"""Daily surface currents and eddies, with their errors, from along-track satellite sea level."""

__version__ = "0.1.0"
