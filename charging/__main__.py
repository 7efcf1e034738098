"""``python -m charging``."""

from charging.cli import main

if __name__ == "__main__":
    main()
