"""Values, risks and pictures of options on two correlated underlyings."""

__version__ = "0.1.0"
