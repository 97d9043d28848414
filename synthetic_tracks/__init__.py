"""The Tarn Sea: an invented moving ocean and four invented altimeters that sample it.

This package is the independent truth of the project's demonstration and checks: it imports nothing
from setdrift, and has its own Earth, orbits, ocean, instrument errors and file dialects.
"""

VERSION = "1"
"""Version of the generator: raised by hand whenever the same scenario would give other files."""
