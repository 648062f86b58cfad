# SPDX-License-Identifier: GPL-3.0-or-later
# Completion of mho in bash: verbs and options are what its help lists.
_mho() {
  local word=${COMP_WORDS[COMP_CWORD]}
  if [ "$COMP_CWORD" -eq 1 ]; then
    COMPREPLY=($(compgen -W "$("$1" --help | sed -n '/^usage/,/^$/d; s/^  \([a-z]*\)  .*/\1/p')" -- "$word"))
  elif [[ $word == -* ]]; then
    COMPREPLY=($(compgen -W "$("$1" help "${COMP_WORDS[1]}" 2>/dev/null |
      sed -n 's/^ *\(-[a-z], \)\{0,1\}\(--[a-z-]*\).*/\2/p')" -- "$word"))
  fi
}
complete -o default -o bashdefault -F _mho mho
