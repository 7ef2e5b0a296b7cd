"""Case files: TOML text ↔ `Case`, and one reading as it is typed on a line.

Whoever opens, checks or saves a case comes through these names; no other part of the tool knows what the file looks like.
"""

from benchtool.casefile.file import LARGEST, decode, dump, dumps, load, loads
from benchtool.casefile.readingline import parse_reading
from benchtool.casefile.save import file_name, reason_of, save_text

__all__ = ["LARGEST", "decode", "dump", "dumps", "file_name", "load", "loads", "parse_reading", "reason_of", "save_text"]
