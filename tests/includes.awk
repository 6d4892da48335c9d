# SPDX-License-Identifier: GPL-3.0-or-later
# Check the #include lines of C files: which folder may include which, and in what order.
#
#   awk -f tests/includes.awk FILE...
#
# Layers: a folder of src/ includes only itself, folders before it in the list below, and tarry/;
# src/cli and tests/unit/example.c see only what is promised in include/tarry, and include/tarry only
# itself. Order in a .c file: its own header, then the project's others, then those of libraries and
# the system, in blocks parted by blank lines, each block sorted.

function complain(text) {
    printf "%s:%d: %s\n", FILENAME, FNR, text
    bad = 1
}

# The folder that says what a file may include.
function layer_of(file, parts, n) {
    n = split(file, parts, "/")
    if (file == "tests/unit/example.c")
        return "example"
    if (parts[1] == "src" && n == 3)
        return parts[2]
    return parts[1]
}

function check_layer(from, name, to, has_folder) {
    has_folder = index(name, "/") > 0
    to = has_folder ? substr(name, 1, index(name, "/") - 1) : ""
    if (to == "tarry" || from == "tests")
        return
    if (from == "include" || from == "example")
        complain("only headers of tarry/ may be included here")
    else if (from == "cli" && to != "cli")
        complain("the program may include only tarry/ and cli/, not " name)
    else if (!(to in rank))
        complain("\"" name "\" is in no folder of src")
    else if (rank[to] > rank[from])
        complain("src/" from " may not include " name ", which stands above it")
}

function own_header(file, own) {
    own = file
    sub(/\.c$/, ".h", own)
    sub(/^(src|tests\/unit|tests\/against|tests\/bench)\//, "", own)
    return own
}

BEGIN {
    n = split("base model engine tally exact study fit report cli", folders, " ")
    for (i = 1; i <= n; i++)
        rank[folders[i]] = i
}

FNR == 1 {
    layer = layer_of(FILENAME)
    ordered = FILENAME ~ /\.c$/
    own = own_header(FILENAME)
    blank = 1
    kind = last = ""
    seen_any = seen_own = 0
}

/^[ \t]*#[ \t]*include/ {
    if (!match($0, /["<][^">]+[">]/)) {
        complain("this include is not understood")
        next
    }
    name = substr($0, RSTART + 1, RLENGTH - 2)
    this = substr($0, RSTART, 1) == "<" ? "system" : name == own ? "own" : "project"
    if (this != "system")
        check_layer(layer, name)
    if (ordered) {
        if (this == "own" && seen_any)
            complain("the file's own header comes first")
        if (kind != "" && this != kind && !blank)
            complain("a blank line parts own, project and system headers")
        if (this == "project" && kind == "system")
            complain("the project's headers come before those of libraries and the system")
        if (this == kind && !blank && name <= last)
            complain(name " is to stand before " last)
    }
    kind = this
    last = name
    blank = 0
    seen_any = 1
    next
}

{ blank = 1 }

END { exit bad }
