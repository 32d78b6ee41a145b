"""`python -m tauledger`: the command line."""

from tauledger.cli import main

main()
