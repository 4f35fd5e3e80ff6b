"""The version, in one place: read by the build, and cheap to ask for."""

__version__ = "0.1.0"
