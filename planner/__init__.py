"""Plan and judge searches for telling gases in the air of transiting planets."""

from importlib.metadata import version as _version

__all__ = ["__version__"]

__version__: str = _version("limbcast")
