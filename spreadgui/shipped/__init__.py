"""Where the files that come with the program lie: beside the code in a wheel, beside the package in a checkout."""

from pathlib import Path

_HERE = Path(__file__).parent
_CHECKOUT = _HERE.parent.parent


def folder(name: str) -> Path:
    """The folder `name` ("sample_books" or "icons"), installed or from a checkout.

    >>> (folder("sample_books") / "one_spark.json").is_file()
    True
    """
    installed = _HERE / name
    return installed if installed.is_dir() else _CHECKOUT / name


def sample_book(name: str) -> Path:
    """The path of one of the books that come with the program."""
    return folder("sample_books") / f"{name}.json"


def icon(name: str) -> Path:
    """The path of one of the program's own drawings."""
    return folder("icons") / f"{name}.svg"
