"""`python -m coatgui` does what the command `coatgui` does."""

import sys

from coatgui.cli import main

if __name__ == "__main__":
    sys.exit(main())
