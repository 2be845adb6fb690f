"""``python -m studies.cli`` is ``haunch``."""

from studies.cli.main import main

if __name__ == "__main__":
    raise SystemExit(main())
