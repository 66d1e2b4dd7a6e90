"""Run the command line as ``python -m decayinfer``."""

from decayinfer.cli import main

if __name__ == "__main__":
    main()
