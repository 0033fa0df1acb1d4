from __future__ import annotations

import sys
from typing import Annotated

import typer

from electrolog.errors import unknown

# Each hands the words typed so far to electrolog.cli.completing, the one being typed last.
SCRIPTS = {
    "bash": """_electrolog() {{
    local IFS=$'\\n'
    local word found=($({python} -m electrolog.cli.completing "${{COMP_WORDS[@]:1:COMP_CWORD}}" 2>/dev/null))
    COMPREPLY=()
    for word in "${{found[@]}}"; do
        [[ ${{COMP_WORDS[COMP_CWORD]}} == [\\"\\']* ]] || printf -v word %q "$word"
        COMPREPLY+=("$word")
    done
}}
complete -o default -o nosort -F _electrolog electrolog
""",
    "zsh": """_electrolog() {{
    local -a found
    found=("${{(@f)$({python} -m electrolog.cli.completing "${{(@)words[2,CURRENT]}}" 2>/dev/null)}}")
    if [[ -n "${{found[1]}}" ]]; then compadd -a found; else _files; fi
}}
compdef _electrolog electrolog
""",
    "fish": """function __electrolog_words
    set -l words (commandline -opc) (commandline -ct)
    set -l found ({python} -m electrolog.cli.completing $words[2..-1] 2>/dev/null)
    if set -q found[1]
        printf '%s\\n' $found
    else
        __fish_complete_path (commandline -ct)
    end
end
complete -c electrolog -f -a '(__electrolog_words)'
""",
    "powershell": """Register-ArgumentCompleter -Native -CommandName electrolog -ScriptBlock {{
    param($word, $ast, $position)
    $words = @($ast.CommandElements | Select-Object -Skip 1 | ForEach-Object {{ $_.ToString() }})
    if ($word -eq '') {{ $words += '""' }}
    & {python} -m electrolog.cli.completing @words 2>$null | ForEach-Object {{
        [System.Management.Automation.CompletionResult]::new($_, $_, 'ParameterValue', $_)
    }}
}}
""",
}
HOW = {
    "bash": 'add to ~/.bashrc:  eval "$(electrolog completion bash)"',
    "zsh": 'add to ~/.zshrc behind compinit:  eval "$(electrolog completion zsh)"',
    "fish": "electrolog completion fish > ~/.config/fish/completions/electrolog.fish",
    "powershell": "add to $PROFILE:  electrolog completion powershell | Out-String | Invoke-Expression",
}


def command(shell: Annotated[str, typer.Argument(metavar="SHELL", help="bash, zsh, fish or powershell")]) -> None:
    """Print what makes the shell complete commands, options, labels and words.

    electrolog completion bash
    """
    if shell not in SCRIPTS:
        raise unknown("shell", shell, SCRIPTS)
    python = f"'{sys.executable}'"
    sys.stdout.write(f"# {HOW[shell]}\n{SCRIPTS[shell].format(python=python)}")
