"""What a shell needs to complete the command line, made from the arguments themselves."""

from __future__ import annotations

import argparse
from dataclasses import dataclass
from typing import TYPE_CHECKING, Final

if TYPE_CHECKING:
    from collections.abc import Callable, Iterator

#: What stands for a file in the help.
_FILES: Final = frozenset({"FILE", "NETLIST", "CELLS", "BEFORE", "AFTER", "MEASUREMENTS"})


@dataclass(frozen=True, slots=True)
class _Option:
    """An option: its name, what it means, and what may follow it."""

    name: str
    words: str
    value: str
    choices: tuple[str, ...]

    @property
    def is_file(self) -> bool:
        return self.value in _FILES


@dataclass(frozen=True, slots=True)
class _Command:
    """A command with its options; that without a name is the program."""

    name: str
    words: str
    options: tuple[_Option, ...]


def completion(parser: argparse.ArgumentParser, shell: str) -> str:
    """Return the text that teaches a shell to complete a program's command line.

    Parameters
    ----------
    parser : argparse.ArgumentParser
        With commands.
    shell : {"bash", "zsh", "fish"}

    Raises
    ------
    KeyError
        For any other shell.

    Examples
    --------
    >>> some = argparse.ArgumentParser("evenstage")
    >>> analyse = some.add_subparsers().add_parser("analyse", description="The paths.")
    >>> print(completion(some, "fish").splitlines()[2])
    complete -c evenstage -n __fish_use_subcommand -f -a analyse -d 'The paths'
    """
    commands = [_Command("", "", tuple(_options(parser))), *_commands(parser)]
    return "\n".join([*SHELLS[shell](parser.prog, commands), ""])


def _commands(parser: argparse.ArgumentParser) -> Iterator[_Command]:
    for action in parser._actions:
        if isinstance(action, argparse._SubParsersAction):
            for name, inner in action.choices.items():
                words = (inner.description or "").rstrip(".")
                yield _Command(name, words, tuple(_options(inner)))


def _options(parser: argparse.ArgumentParser) -> Iterator[_Option]:
    for action in parser._actions:
        names = [name for name in action.option_strings if name.startswith("--")]
        for name in names:
            choices = tuple(map(str, action.choices or ()))
            takes = action.nargs != 0
            value = str(action.metavar or action.dest).upper() if takes else ""
            yield _Option(name, action.help or "", value, choices)


def _bash(program: str, commands: list[_Command]) -> Iterator[str]:
    names = " ".join(command.name for command in commands if command.name)
    yield f"# completion of {program}: source this from ~/.bashrc"
    yield f"_{program}() {{"
    yield "  local word=${COMP_WORDS[COMP_CWORD]} before=${COMP_WORDS[COMP_CWORD-1]}"
    yield "  local command=${COMP_WORDS[1]} options files"
    yield "  local IFS=$'\\n'"
    yield "  COMPREPLY=()"
    yield '  case "$command $before" in'
    for command in commands:
        for option in command.options:
            if not option.value:
                continue
            place = f'"{command.name} {option.name}"' if command.name else f'*" {option.name}"'
            if option.is_file:
                yield f'    {place}) COMPREPLY=($(compgen -f -- "$word")); return ;;'
            else:
                yield f"    {place}) {_bash_words(' '.join(option.choices))}; return ;;"
    yield "  esac"
    yield "  files=1"
    yield '  case "$command" in'
    for command in commands:
        if command.name:
            options = " ".join(option.name for option in command.options)
            yield f'    {command.name}) options="{options}" ;;'
    yield "  esac"
    yield "  if ((COMP_CWORD == 1)); then"
    options = " ".join(option.name for option in commands[0].options)
    yield f'    options="{names} {options}" files='
    yield "  fi"
    yield "  if [[ -z $files || $word == -* ]]; then"
    yield f"    {_bash_words('$options')}"
    yield "  else"
    yield '    COMPREPLY=($(compgen -f -- "$word"))'
    yield "  fi"
    yield "}"
    yield f"complete -o filenames -F _{program} {program}"


def _bash_words(words: str) -> str:
    """Return what offers some words; the separator is that of words here alone."""
    return f'COMPREPLY=($(IFS=" "; compgen -W "{words}" -- "$word"))'


def _zsh(program: str, commands: list[_Command]) -> Iterator[str]:
    yield f"#compdef {program}"
    yield f"# completion of {program}: keep this as _{program} in a folder of $fpath, or source it"
    yield f"_{program}() {{"
    yield "  local -a commands"
    yield "  commands=("
    yield from (
        f"    {_quoted(f'{command.name}:{command.words}')}" for command in commands if command.name
    )
    yield "  )"
    yield "  if ((CURRENT == 2)); then"
    yield "    _describe -t commands command commands"
    yield f"    _arguments {' '.join(map(_zsh_option, commands[0].options))}"
    yield "    return"
    yield "  fi"
    yield "  local command=${words[2]}"
    yield "  shift words"
    yield "  ((CURRENT--))"
    yield "  case $command in"
    for command in commands:
        if command.name:
            options = " ".join(map(_zsh_option, command.options))
            yield f"    {command.name}) _arguments {options} '*:file:_files' ;;"
    yield "  esac"
    yield "}"
    yield f"if [[ ${{funcstack[1]}} == _{program} ]]; then"
    yield f'  _{program} "$@"'
    yield "else"
    yield f"  compdef _{program} {program}"
    yield "fi"


def _zsh_option(option: _Option) -> str:
    words = option.words
    for special in "\\[]:":
        words = words.replace(special, f"\\{special}")
    end = ""
    if option.choices:
        end = f":{option.value}:({' '.join(option.choices)})"
    elif option.value:
        end = f":{option.value}:{'_files' if option.is_file else ' '}"
    return _quoted(f"*{option.name}[{words}]{end}")


def _fish(program: str, commands: list[_Command]) -> Iterator[str]:
    yield f"# completion of {program}: keep this as ~/.config/fish/completions/{program}.fish"
    for command in commands:
        begin = f"complete -c {program} -n "
        if command.name:
            yield f"{begin}__fish_use_subcommand -f -a {command.name} -d {_quoted(command.words)}"
            begin += f"'__fish_seen_subcommand_from {command.name}'"
        else:
            begin += "__fish_use_subcommand"
        for option in command.options:
            takes = ("-r -F" if option.is_file else "-x") if option.value else "-f"
            some = f" -a {_quoted(' '.join(option.choices))}" if option.choices else ""
            words = _quoted(option.words)
            yield f"{begin} -l {option.name.removeprefix('--')} {takes}{some} -d {words}"


def _quoted(text: str) -> str:
    """Return a text as one word of any of the shells."""
    return "'" + text.replace("'", "'\"'\"'") + "'"


#: By name of the shell.
SHELLS: Final[dict[str, Callable[[str, list[_Command]], Iterator[str]]]] = {
    "bash": _bash,
    "zsh": _zsh,
    "fish": _fish,
}
