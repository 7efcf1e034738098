"""halflit: how the outside of a spacecraft charges along its orbit."""

__version__ = "0.1.0"
