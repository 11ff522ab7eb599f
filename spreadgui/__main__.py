"""`python -m spreadgui` is the command `spreadgui`."""

import sys

from spreadgui.command import main

if __name__ == "__main__":
    sys.exit(main())
