"""`python3 app [command ...]`: enter an environment that holds the packages, then run the command."""

import os
import sys

# Run as a folder, Python puts app/ itself first on its path, where `import app` would find nothing.
sys.path[0] = os.path.dirname(os.path.dirname(os.path.abspath(__file__)))

from app.bootstrap.python import require_supported_python

require_supported_python()

# Everything from here on may be written for the supported Pythons only.
from app.bootstrap.environment import RUNTIME, Program, enter

enter(Program(folder=os.path.dirname(os.path.abspath(__file__)), needs=RUNTIME), sys.argv[1:])

# The packages that the commands import exist only from here on.
from app.cli import main

sys.exit(main(sys.argv[1:]))
