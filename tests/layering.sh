#!/usr/bin/env bash
# Fails when an arrow points back: a folder includes one that builds on it, or
# core/math, model, filter or engine call anything but memory and string
# functions and sqrt, or keep data that can change.
# usage: tests/layering.sh LIBRARY...   (the archives of those four folders)
# SPDX-License-Identifier: Apache-2.0
set -euo pipefail
cd "$(dirname "${BASH_SOURCE[0]}")/.."
bad=0

finding() {
    echo "layering: $1"
    bad=1
}

# folder, the folders and headers that it must not include
forbid() {
    local hits
    hits=$(grep -rnE "^[[:space:]]*#[[:space:]]*include[[:space:]]*[<\"]($2)" \
        "$1" --include='*.[ch]' || true)
    [ -z "$hits" ] || finding "$hits"
}

system='uv\.h|msgpack|cjson/|udunits|pcap/|time\.h|unistd\.h|sys/|pthread\.h|signal\.h|netinet/|arpa/'
above_run='config/|daemon/|tools/|tests/'
forbid core/math "core/(model|filter|engine|wire|run)/|$above_run|$system|stdlib\.h|stdio\.h"
forbid core/model "core/(filter|engine|wire|run)/|$above_run|$system|stdlib\.h|stdio\.h"
forbid core/filter "core/(engine|wire|run)/|$above_run|$system|stdlib\.h|stdio\.h"
forbid core/engine "core/(wire|run)/|$above_run|$system|stdlib\.h|stdio\.h"
forbid core/wire "core/(filter|engine|run)/|$above_run|uv\.h|cjson/|udunits|time\.h|unistd\.h|sys/|pthread\.h"
forbid core/run "$above_run|$system|stdlib\.h|stdio\.h"
forbid config 'daemon/|tools/|tests/|uv\.h|msgpack|time\.h'
forbid daemon 'tools/|tests/'
forbid tools 'tests/|uv\.h'

# What may stay open in those four archives: each other, and these.
allow='_GLOBAL_OFFSET_TABLE_|__stack_chk_fail|__assert_fail|mem(cpy|set|move|cmp)|str[a-z]+|sqrt'
symbols() { nm "$@" 2>/dev/null | grep -v ':$'; }
if [ $# -gt 0 ]; then
    defined=$(symbols --defined-only "$@" | awk 'NF == 3 { print $3 }' | sort -u)
    open=$(symbols -u "$@" | awk '$1 == "U" { print $2 }' | sort -u |
        grep -vxE "$allow" | grep -vxF "$defined" || true)
    [ -z "$open" ] || finding "core calls: $open"
    changing=$(nm -f sysv "$@" | tr -d ' ' | awk -F'|' \
        '$7 ~ /^(\.t?data|\.t?bss|\*COM\*)/ && $7 !~ /^\.data\.rel\.ro/ { print $1 }')
    [ -z "$changing" ] || finding "core keeps data that can change: $changing"
fi
exit $bad
