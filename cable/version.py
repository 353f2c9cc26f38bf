"""The version, in a file that needs nothing else so that packaging and `--help` can read it at once."""

__version__ = "0.1.0"
