# SPDX-License-Identifier: GPL-3.0-or-later
"""Prints where, below an install prefix, this interpreter looks for packages: run by CMake, `install_dir.py PREFIX`."""

import os
import site
import sys

prefix = os.path.normpath(sys.argv[1])
version = "python%d.%d" % sys.version_info[:2]
fallback = os.path.join("lib", version, "site-packages")
searched = [os.path.relpath(path, prefix) for path in site.getsitepackages() + sys.path
            if os.path.isabs(path) and os.path.normpath(path).startswith(prefix + os.sep)
            and os.path.basename(path) in ("dist-packages", "site-packages")]
# Under /usr this may hold /usr/local's folder too, which is no place for a /usr install.
searched = [path for path in searched if path.startswith("lib" + os.sep)]
print(searched[0] if searched else fallback)
