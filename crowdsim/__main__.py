"""`python -m crowdsim`."""

from crowdsim.cli import main

main()
