"""Preloaded by a Dask worker: a machine on which Haunch is not installed."""

import sys


class Missing:
    def find_spec(self, name, path=None, target=None):
        if name.partition(".")[0] == "studies":
            raise ModuleNotFoundError(f"No module named {name!r}", name=name)


sys.meta_path.insert(0, Missing())
