# SPDX-License-Identifier: GPL-3.0-or-later
# Sum up what gcov -b -c says about the files of src: lines run and branches taken at least once, a folder, and
# the lines that fail (tarry_fail...) and that no test has run. A header counts once, with what all who include
# it do. Lines that call a macro of uthash are left out of the branches: one call makes some 70 of them,
# which belong to that library.
#
#   awk -v least="model 95,engine 95" -f tests/branches.awk FILE.gcov...
#
# Exit status 1 where a folder named in `least` has a smaller share of branches taken, or where no test provokes
# something that is said about a user's input. Guards (failed allocations, numerics that cannot be solved) are
# counted and told.

function share(part, whole) {
    return whole ? 100 * part / whole : 100
}

/^ *-: *0:Source:/ {
    source = $0
    sub(/^.*Source:/, "", source)
    ours = source ~ /^src\//
    next
}

!ours { next }

/^ *([0-9]+\*?|#####|=====): *[1-9]/ {
    count = number = text = $0
    sub(/:.*/, "", count)
    sub(/^[^:]*: */, "", number)
    sub(/:.*/, "", number)
    sub(/^[^:]*:[^:]*: */, "", text)
    line = source ":" number
    said[line] = text
    if (!(line in ran)) {
        order[++n_lines] = line
        ran[line] = 0
    }
    ran[line] += count !~ /#|=/
    foreign = text ~ /HASH_[A-Z_]+\(/
    next
}

/^branch/ && !foreign {
    branch = line " " $2
    taken[branch] += !/taken 0|never executed/
}

END {
    for (i = 1; i <= n_lines; i++) {
        split(order[i], part, "/")
        folder = part[2]
        if (!(folder in n_of))
            folders[++n_folders] = folder
        n_of[folder]++
        n_ran[folder] += ran[order[i]] > 0
        if (ran[order[i]] || said[order[i]] !~ /tarry_fail[a-z_]*\(/)
            continue
        if (said[order[i]] ~ /tarry_fail_memory|TARRY_NUMERIC|TARRY_MEMORY/)
            guards[++n_guards] = order[i] ": " said[order[i]]
        else
            refusals[++n_refusals] = order[i] ": " said[order[i]]
    }
    for (branch in taken) {
        split(branch, part, "/")
        n_branches[part[2]]++
        n_taken[part[2]] += taken[branch] > 0
    }
    printf "%-8s %7s %7s %9s %7s\n", "src", "lines", "run", "branches", "taken"
    for (i = 1; i <= n_folders; i++) {
        f = folders[i]
        printf "%-8s %7d %5.1f %% %9d %5.1f %%\n", f, n_of[f], share(n_ran[f], n_of[f]), n_branches[f],
            share(n_taken[f], n_branches[f])
    }
    print n_guards + 0 " guards that no test sets off:"
    for (i = 1; i <= n_guards; i++)
        print "  " guards[i]
    for (i = 1; i <= n_refusals; i++)
        print "no test provokes " refusals[i]
    n = split(least, wanted, ",")
    for (i = 1; i <= n; i++) {
        split(wanted[i], pair, " ")
        if (share(n_taken[pair[1]], n_branches[pair[1]]) < pair[2]) {
            printf "too few: of the branches of src/%s at least %s %% are to be taken\n", pair[1], pair[2]
            bad = 1
        }
    }
    exit bad || n_refusals > 0
}
