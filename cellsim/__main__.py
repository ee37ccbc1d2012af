"""`python -m cellsim`."""

from cellsim.cli.main import main

if __name__ == "__main__":
    main()
