"""Runs Windows Python with an environment: launch.py ENVIRONMENT.json ARGUMENTS...

Wine sets the folders of a user anew at the start of the first program, so they have to be set inside.
"""

import json
import os
import subprocess
import sys

with open(sys.argv[1], encoding="utf-8") as f:
    environment = {**os.environ, **json.load(f)}
raise SystemExit(subprocess.call([sys.executable, *sys.argv[2:]], env=environment))
