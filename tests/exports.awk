# SPDX-License-Identifier: GPL-3.0-or-later
# The functions that headers declare, as a version script for the linker: these are global, all else local.
#
#   awk -f tests/exports.awk include/tarry/*.h

# A declaration begins a line and ends at a semicolon; comments and what stands in braces are no such thing.
{
    line = $0
    if (in_comment) {
        if (!match(line, /\*\//))
            next
        line = substr(line, RSTART + 2)
        in_comment = 0
    }
    while (match(line, /\/\*/)) {
        before = substr(line, 1, RSTART - 1)
        rest = substr(line, RSTART + 2)
        if (match(rest, /\*\//)) {
            line = before substr(rest, RSTART + 2)
        } else {
            line = before
            in_comment = 1
        }
    }
    if (line ~ /^[a-z].*[ *]tarry_[a-z0-9_]+\(/ && line !~ /^typedef/) {
        match(line, /tarry_[a-z0-9_]+\(/)
        names[substr(line, RSTART, RLENGTH - 1)] = 1
    }
}

END {
    print "{"
    print "    global:"
    n = 0
    for (name in names)
        sorted[++n] = name
    for (i = 2; i <= n; i++)
        for (j = i; j > 1 && sorted[j] < sorted[j - 1]; j--) {
            other = sorted[j]
            sorted[j] = sorted[j - 1]
            sorted[j - 1] = other
        }
    for (i = 1; i <= n; i++)
        printf "        %s;\n", sorted[i]
    print "    local: *;"
    print "};"
}
