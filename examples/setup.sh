# SPDX-License-Identifier: GPL-3.0-or-later
# What examples/start, tests/run and .ci/run share: the list of packages, the interpreter, the build. Sourced, never run.
# shellcheck shell=bash

root=$(cd "$(dirname "${BASH_SOURCE[0]}")/.." && pwd)

# Debian's names, the only list there is. gnuradio-dev brings GNU Radio itself, VOLK, pybind11 and Python's headers.
packages_to_build=(gnuradio-dev cmake make g++ ccache nlohmann-json3-dev libboost-dev
    python3-numpy python3-click python3-rich python3-matplotlib)
packages_to_test=("${packages_to_build[@]}" libgtest-dev libbenchmark-dev clang-format
    mypy python3-pytest python3-pypdf weasyprint python3-scipy python3-mpmath
    python3-aiohttp python3-prometheus-client python3-pyqt5 python3-pyqtgraph chromium chromium-driver python3-selenium python3-sphinx python3-yaml)

say() { printf '== %s\n' "$*"; }
fail() { printf '%s: %s\n' "$(basename "$0")" "$*" >&2; exit 2; }

# install_missing PACKAGE…: names and installs those that are not there; does nothing, and asks nothing, where all are.
install_missing() {
    local package missing=() become=()
    if ! command -v dpkg-query >/dev/null || ! command -v apt-get >/dev/null; then
        say "no apt-get on this system: it is left to you to have what Debian calls $*"
        return 0
    fi
    for package in "$@"; do
        if [ "$(dpkg-query -W -f='${db:Status-Status}' "$package" 2>/dev/null)" != installed ]; then
            missing+=("$package")
        fi
    done
    [ ${#missing[@]} -gt 0 ] || return 0

    say "to be installed with what they need: ${missing[*]}"
    if [ "$(id -u)" != 0 ]; then
        command -v sudo >/dev/null || fail "neither root nor sudo: as root, run apt-get install --no-install-recommends ${missing[*]}"
        become=(sudo)
    fi
    # One call, so that the password is asked for once. The lists are fetched only where they do not know a package or
    # name files that the mirror no longer has.
    # shellcheck disable=SC2016
    "${become[@]}" env DEBIAN_FRONTEND=noninteractive sh -ec '
        install() { apt-get install --yes --quiet --no-install-recommends "$@"; }
        apt-cache show "$@" >/dev/null 2>&1 || apt-get update --quiet
        install "$@" || { apt-get update --quiet && install "$@"; }' install_missing "${missing[@]}" ||
        fail "apt-get could not install: ${missing[*]}"
}

# pick_python: sets `python` to an interpreter that has GNU Radio; the first python3 on PATH need not be one.
pick_python() {
    local candidate
    for candidate in python3 /usr/bin/python3 /usr/local/bin/python3; do
        if python=$("$candidate" -c 'import sys, gnuradio.gr, numpy; print(sys.executable)' 2>/dev/null); then
            return 0
        fi
    done
    fail "no python3 here can import gnuradio.gr and numpy"
}

# build_tree DIRECTORY OPTION…: configures the sources into DIRECTORY with these options and builds all, or the targets
# named in the array `targets`.
build_tree() {
    local directory=$1
    shift
    say "building in ${directory#"$root"/}/"
    mkdir -p "$directory"
    cmake -S "$root" -B "$directory" "$@" >"$directory/configure.log" 2>&1 || {
        cat "$directory/configure.log" >&2
        fail "configuring failed"
    }
    cmake --build "$directory" -j2 ${targets:+--target "${targets[@]}"}
}
