"""`python -m fellspan` is the command line too."""

from fellspan.cli.main import main

if __name__ == "__main__":
    main()
