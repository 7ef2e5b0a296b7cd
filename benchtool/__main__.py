"""`python -m benchtool`: the same door as the installed command, where that is not on the path."""

from benchtool.cli import entry

if __name__ == "__main__":
    entry()
