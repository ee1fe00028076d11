"""`python -m localcomp`: the same as the command `localcomp`."""

from localcomp.cli.main import run

if __name__ == "__main__":
    run()
