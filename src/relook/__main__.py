"""`python -m relook` is `relook`."""

from relook.cli import main

if __name__ == "__main__":
    main()
