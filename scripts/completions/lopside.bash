# Completion of lopside(1) and lopside-inbox(1) for bash. All words come from the programs' own help, so that they
# cannot differ from it. File names are completed where nothing else fits.
# shellcheck shell=bash

# The options of a command, one a line. `$1 help STAGE` or `$1 --help`.
_lopside_options() {
    "$@" 2>/dev/null | sed -nE 's/^  (-[[:alnum:]], |    )?(--[a-z-]+).*/\2/p'
}

# The choices that the help of report gives for an option: "--as FORM  what to make: text, csv [text]".
_lopside_choices() { # PROGRAM OPTION
    "$1" help report 2>/dev/null | sed -nE "s/^  $2 .*: ([a-z0-9, -]+).*/\\1/p" | tr -d ','
}

# The runs of the sheet that stands on the line.
_lopside_runs() {
    local word
    for word in "${COMP_WORDS[@]:2}"; do
        [ -f "$word" ] && sed -nE 's/^[[:blank:]]*\[[[:blank:]]*run[[:blank:]]+([^]]*[^][:blank:]])[[:blank:]]*\].*/\1/p' "$word"
    done
}

_lopside() {
    local program=${COMP_WORDS[0]} word=${COMP_WORDS[COMP_CWORD]} before='' stage=${COMP_WORDS[1]:-} line
    [ "$COMP_CWORD" -eq 0 ] || before=${COMP_WORDS[COMP_CWORD - 1]}
    COMPREPLY=()
    if [ "${program##*/}" = lopside-inbox ]; then
        [[ $word != -* ]] || mapfile -t COMPREPLY < <(compgen -W "$(_lopside_options "$program" --help)" -- "$word")
    elif [ "$COMP_CWORD" -eq 1 ] || { [ "$COMP_CWORD" -eq 2 ] && [ "$stage" = help ]; }; then
        mapfile -t COMPREPLY < <(compgen -W "$("$program" help 2>/dev/null | sed -nE 's/^  ([a-z]+)  .*/\1/p') \
            $([ "$COMP_CWORD" -eq 2 ] || echo help --help --version)" -- "$word")
    elif [ "$before" = --as ] || [ "$before" = --what ]; then
        mapfile -t COMPREPLY < <(compgen -W "$(_lopside_choices "$program" "$before")" -- "$word")
    elif [ "$before" = --run ]; then
        while IFS= read -r line; do
            [[ $line != "$word"* ]] || COMPREPLY+=("$(printf '%q' "$line")")
        done < <(_lopside_runs)
    elif [ "$before" = --angles ]; then
        mapfile -t COMPREPLY < <(compgen -W "against with" -- "$word")
    elif [[ $word == -* ]]; then
        mapfile -t COMPREPLY < <(compgen -W "$(_lopside_options "$program" help "$stage")" -- "$word")
    fi
}

complete -o default -o bashdefault -F _lopside lopside lopside-inbox
