"""`python -m uffuncs` is the command line."""

from .command_line import main

main()
