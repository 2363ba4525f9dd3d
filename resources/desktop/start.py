"""Entry of the standalone program: what the command `coatgui` does."""

import multiprocessing
import sys

from coatgui.cli import main

if __name__ == "__main__":
    # A worker process of a frozen program is this very file: it must not start a second program.
    multiprocessing.freeze_support()
    sys.exit(main())
