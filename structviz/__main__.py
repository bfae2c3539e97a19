"""`python -m structviz` is the console script."""

from structviz.cli.main import entry

if __name__ == "__main__":
    raise SystemExit(entry())
