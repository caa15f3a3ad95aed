"""Reading and writing stellar models; one file a format."""

from oscsolve.star.formats.recognise import read_model

__all__ = ["read_model"]
