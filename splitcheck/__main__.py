"""``python -m splitcheck``: the same as the ``splitcheck`` command."""

from splitcheck.cli import main

if __name__ == "__main__":
    main()
