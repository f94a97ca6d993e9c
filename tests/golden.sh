#!/bin/sh
# SPDX-License-Identifier: Apache-2.0
# One capture gives one sequence of bytes, whatever built the program: replays
# both example rigs with gcc and clang at -O0 and -O3 and holds the SHA-256 of
# all that was said (the description names the build and is left out) against
# tests/data/golden.txt.  `golden.sh --write` after a change of outputs, together
# with a new ENGINE_NUMBER.
set -eu
cd "$(dirname "$0")/.."
out=${GOLDEN_DIR:-build/golden}
golden=tests/data/golden.txt
engine=$(sed -n 's/.*ENGINE_NUMBER = \([0-9]*\).*/\1/p' core/wire/encode.h)
passed=0 failed=0

hash_of() { # tool, rig
    "$1" replay --stream both "config/rigs/$2.json" "tests/data/golden/$2.pcap" 2>/dev/null |
        grep -v '^{"type":"description"' | sha256sum | cut -d' ' -f1
}

check() { # what, rig, hash
    expected=$(awk -v r="$2" -v e="$engine" '$1 == r && $2 == e {print $3}' "$golden")
    if [ "$3" = "$expected" ]; then
        passed=$((passed + 1))
    else
        failed=$((failed + 1))
        echo "$1 $2: $3 is not $expected (engine $engine): outputs changed without a new ENGINE_NUMBER, or this build computes differently"
    fi
}

if [ "${1:-}" = --write ]; then
    for rig in carriage rafts; do
        echo "$rig $engine $(hash_of build/ropewalk $rig)"
    done >"$golden"
    cat "$golden"
    exit 0
fi

for cc in gcc clang; do
    for opt in O0 O3; do
        dir=$out/$cc-$opt
        cmake -G Ninja -S . -B "$dir" -DCMAKE_C_COMPILER=$cc -DCMAKE_BUILD_TYPE=None \
            -DCMAKE_C_FLAGS="-$opt" >/dev/null
        ninja -C "$dir" ropewalk >/dev/null
        for rig in carriage rafts; do
            check "$cc -$opt" $rig "$(hash_of "$dir/ropewalk" $rig)"
        done
    done
done
echo "golden: $passed passed, $failed failed"
[ "$failed" -eq 0 ]
