#!/usr/bin/env bash
# Fails when a source file has no line in DEVELOPERS.md, section 8, or a line no
# file; when a file or function is too long; when a comment names a reference
# that section 7 does not list.
# SPDX-License-Identifier: Apache-2.0
set -euo pipefail
cd "${1:-$(dirname "${BASH_SOURCE[0]}")/..}"
bad=0
file_max=500
function_max=80

finding() {
    echo "files: $1"
    bad=1
}

sources() {
    find core config daemon tools tests -name '*.[ch]' -o -name '*.sh' \
        -path 'tests/*' | sort
    echo tools/dev
}

# "name.{c,h}" stands for two files.
# shellcheck disable=SC2016 # the backquotes are markdown's
listed() {
    sed -n '/^## 8\. Files/,$p' DEVELOPERS.md |
        sed -nE 's/^\| `([^`]+)` \| .+ \|$/\1/p' |
        sed -E '/\{c,h\}$/{s/\{c,h\}$/c/p;s/c$/h/}' | sort
}

while read -r path; do
    finding "$path: has no line in DEVELOPERS.md, section 8"
done < <(comm -23 <(sources | sort) <(listed))
while read -r path; do
    finding "$path: stands in DEVELOPERS.md, section 8, but is not there"
done < <(comm -13 <(sources | sort) <(listed))

while read -r path; do
    n=$(wc -l <"$path")
    [ "$n" -le $file_max ] || finding "$path: $n lines, more than $file_max: split it"
    long=$(awk -v max=$function_max '
        /^\{/ { begin = NR }
        /^\}/ && begin { if (NR - begin + 1 > max) print begin; begin = 0 }' "$path")
    for line in $long; do
        finding "$path:$line: a function of more than $function_max lines: split it"
    done
done < <(sources)

keys=$(sed -n '/^## 7\. References/,/^## 8/p' DEVELOPERS.md |
    sed -nE 's/^\| ([A-Z0-9-]+) \|.*/\1/p')
while IFS=: read -r path key; do
    grep -qxF -- "$key" <<<"$keys" ||
        finding "$path: [$key] is not in DEVELOPERS.md, section 7"
done < <(grep -roE '\[[A-Z]+[A-Z0-9-]*[0-9]{2,}\]|\[(DLMF|FDLIBM|NIST-[A-Z]+)\]' \
    core config daemon tools tests --include='*.[ch]' | sed -E 's/\[(.*)\]/\1/' | sort -u)
exit $bad
