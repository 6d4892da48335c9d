#!/bin/sh
# SPDX-License-Identifier: GPL-3.0-or-later
# shellcheck disable=SC2317 # cases are functions, called by name
# The manual page and the completions for shells, made of the tables that the program goes by.
# shellcheck source=tests/cli/helpers.sh
. "${0%/*}/helpers.sh"

page() {
    run 0 help --as man || return 1
    cp out tarry.1
    groff -man -ww -Tascii -P-cbou tarry.1 >page 2>err && [ ! -s err ] || return 1
    for option in $("$TARRY" help run | sed -n 's/^  \(--[a-z]*\).*/\1/p'); do
        grep -qF -- "$option" page || return 1
    done
    grep -q 'EXIT STATUS' page && grep -q 'not for clinical' page
}
ok "the manual page is sound and tells every option of run" page

# offers WORD... : what bash offers for the last word of a command line
offers() {
    bash -c '. ./completion; COMP_WORDS=("$@"); COMP_CWORD=$(($# - 1)); _tarry; printf "%s\n" "${COMPREPLY[@]}"' \
        bash "$@" | sort
}

bash_completion() {
    run 0 help --as bash || return 1
    cp out completion
    touch vela.yaml
    [ "$(offers tarry pr)" = predict ] && [ "$(offers tarry run --ov)" = --overwrite ] &&
        [ "$(offers tarry check --ov)" = "" ] && [ "$(offers tarry run ve)" = vela.yaml ]
}
ok "bash completes commands, options and files" bash_completion

# There may be no zsh: then the words are looked at.
zsh_completion() {
    run 0 help --as zsh && says out "#compdef tarry" && says out "'--cells[cells to simulate" || return 1
    ! command -v zsh >/dev/null || zsh -n out
}
ok "zsh has every command and option" zsh_completion
ok "any other form" wrong "man, bash and zsh" help --as html
finish
