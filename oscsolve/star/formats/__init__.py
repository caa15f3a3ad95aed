"""Reading and writing stellar models; one file a format."""

from oscsolve.star.formats.recognise import FORMATS, Format, read_model, write_model

__all__ = ["FORMATS", "Format", "read_model", "write_model"]
