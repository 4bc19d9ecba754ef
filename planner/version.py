"""The version of the tool, as answers state it."""

__all__ = ["VERSION"]

VERSION = "0.1"
