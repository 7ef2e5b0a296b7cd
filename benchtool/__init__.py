"""benchtool: bench diagnosis of mains supplies without a transformer. See README.md."""

__version__ = "0.1.0"
