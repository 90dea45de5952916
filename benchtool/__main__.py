"""``python -m benchtool``."""

from benchtool.cli.main import run

if __name__ == "__main__":
    run()
