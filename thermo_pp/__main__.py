"""``python -m thermo_pp``: the same program as ``thermo-pp``."""

from thermo_pp.cli import main

if __name__ == "__main__":
    main(prog_name="thermo-pp")
