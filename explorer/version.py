"""The version of the tool, for the package, the record and the build."""

__version__ = "0.1.0"
