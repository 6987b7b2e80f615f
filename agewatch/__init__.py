"""AgeWatch: watches steel coils age in store and raises the alarm before a coil is pressed too late."""

__version__ = "0.1.0"
