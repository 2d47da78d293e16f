"""`python -m reactance.daemon`: the command line where the `reactance` script is not on the path."""

from reactance.daemon.cli import main

if __name__ == "__main__":
    main()
