"""The version of the package, in one place for the build and for the results."""

__version__ = "0.1.0"
