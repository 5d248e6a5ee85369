"""Entry point of ``thermo-fix`` and ``python -m thermo_fix``."""

from thermo_fix.cli import main

if __name__ == "__main__":
    main()
