"""The version, read by the package and by the build."""

__version__ = "0.1.0"
