"""python -m moletally"""

from moletally.cli import main

main()
