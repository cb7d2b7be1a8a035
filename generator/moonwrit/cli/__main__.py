"""``python -m moonwrit.cli``"""

from moonwrit.cli import main

main()
