"""Completion of commands, options and names in a shell, as a script that the shell reads at its start.

The script holds everything: pressing Tab starts no program. Names of targets and instruments are those that
are found when the script is made.
"""

from __future__ import annotations

from collections.abc import Mapping, Sequence
from dataclasses import dataclass
from typing import Literal

Kind = Literal["flag", "text", "file", "target", "instrument", "show", "shell"]
SHELLS = ("bash", "zsh", "fish")


@dataclass(frozen=True, slots=True)
class Option:
    """An option: its name with hyphens, what kind of word follows, and whether several may."""

    name: str
    kind: Kind
    several: bool
    help: str


@dataclass(frozen=True, slots=True)
class Syntax:
    """A command: its name, the question it answers, the kind of its own word, its options."""

    name: str
    question: str
    word: Kind
    options: tuple[Option, ...]


def completion_script(shell: str, commands: Sequence[Syntax], names: Mapping[str, Sequence[str]]) -> str:
    """Return the script of a shell; `names` holds the words of the kinds target, instrument, show, shell.

    Raises: KeyError for a shell that has none.
    """
    return {"bash": _bash, "zsh": _zsh, "fish": _fish}[shell](commands, names)


def _options_with(commands: Sequence[Syntax], kind: str) -> list[str]:
    """Return the options of any command that are followed by a word of this kind."""
    found = (option.name for each in commands for option in each.options if option.kind == kind)
    return list(dict.fromkeys(found))


def _bash(commands: Sequence[Syntax], names: Mapping[str, Sequence[str]]) -> str:
    several = {option.name for each in commands for option in each.options if option.several}
    values, words, options = [], [], []
    for kind, listed in names.items():
        for option in _options_with(commands, kind):
            distance = "*" if option in several else "1"
            values.append(f"        {option}:{distance}) known='{' '.join(listed)}' ;;")
    for each in commands:
        known = " ".join(option.name for option in each.options)
        options.append(f"            {each.name}) known='{known}' ;;")
        if each.word in names:
            words.append(f"            {each.name}) known='{' '.join(names[each.word])}' ;;")
    listed_commands = " ".join(each.name for each in commands)
    return "\n".join(
        [
            '# Completion of coldglow for bash: put  eval "$(coldglow completion bash)"  into ~/.bashrc',
            "_coldglow() {",
            "    local word=${COMP_WORDS[COMP_CWORD]} known='' at=$((COMP_CWORD - 1))",
            "    COMPREPLY=()",
            "    if ((COMP_CWORD == 1)); then",
            f"        COMPREPLY=($(compgen -W '{listed_commands} --help --version' -- \"$word\"))",
            "        return",
            "    fi",
            "    while ((at > 1)) && [[ ${COMP_WORDS[at]} != --* ]]; do ((at--)); done",
            "    case ${COMP_WORDS[at]}:$((COMP_CWORD - at)) in",
            *values,
            "    esac",
            "    if [[ $word == -* ]]; then",
            "        case ${COMP_WORDS[1]} in",
            *options,
            "        esac",
            "    elif [[ -z $known ]]; then",
            "        case ${COMP_WORDS[1]} in",
            *words,
            "        esac",
            "    fi",
            '    COMPREPLY=($(compgen -W "$known" -- "$word"))',
            "}",
            "complete -o default -F _coldglow coldglow",
            "",
        ]
    )


def _zsh(commands: Sequence[Syntax], names: Mapping[str, Sequence[str]]) -> str:
    described = [f"        {_quoted(f'{each.name}:{each.question}')}" for each in commands]
    values = [
        f"        {'|'.join(found)}) compadd -- {' '.join(listed)}; return ;;"
        for kind, listed in names.items()
        if (found := _options_with(commands, kind))
    ]
    options = [
        f"            {each.name}) compadd -- {' '.join(option.name for option in each.options)} ;;"
        for each in commands
    ]
    words = [
        f"        {each.name}) compadd -- {' '.join(names[each.word])}; _files ;;"
        for each in commands
        if each.word in names
    ]
    return "\n".join(
        [
            "#compdef coldglow",
            '# Completion of coldglow for zsh: put  eval "$(coldglow completion zsh)"  into ~/.zshrc',
            "_coldglow() {",
            "    local -a commands",
            "    commands=(",
            *described,
            "    )",
            "    if (( CURRENT == 2 )); then _describe command commands; return; fi",
            "    case $words[CURRENT-1] in",
            *values,
            "    esac",
            "    if [[ $words[CURRENT] == -* ]]; then",
            "        case $words[2] in",
            *options,
            "        esac",
            "        return",
            "    fi",
            "    case $words[2] in",
            *words,
            "        *) _files ;;",
            "    esac",
            "}",
            "compdef _coldglow coldglow",
            "",
        ]
    )


def _fish(commands: Sequence[Syntax], names: Mapping[str, Sequence[str]]) -> str:
    lines = ["# Completion of coldglow for fish: write it to ~/.config/fish/completions/coldglow.fish"]
    for each in commands:
        lines.append(
            f"complete -c coldglow -n __fish_use_subcommand -f -a {each.name} -d {_quoted(each.question)}"
        )
        here = f"complete -c coldglow -n '__fish_seen_subcommand_from {each.name}'"
        if each.word in names:
            lines.append(f"{here} -a {_quoted(' '.join(names[each.word]))}")
        for option in each.options:
            parts = [f"{here} -l {option.name.removeprefix('--')}"]
            if option.kind in names:
                parts.append(f"-x -a {_quoted(' '.join(names[option.kind]))}")
            elif option.kind != "flag":
                parts.append("-r")
            if option.help:
                parts.append(f"-d {_quoted(option.help)}")
            lines.append(" ".join(parts))
    return "\n".join([*lines, ""])


def _quoted(text: str) -> str:
    """Return a text in single quotes, as these shells read them."""
    return "'" + text.replace("\\", "").replace("'", "’") + "'"
