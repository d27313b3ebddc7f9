"""The version of the library; also read by the build."""

__version__ = "0.1.0"
