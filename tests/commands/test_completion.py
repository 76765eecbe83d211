"""Completion scripts in the real shells."""

from __future__ import annotations

import os
import shutil
import subprocess
import sys
from pathlib import Path

import pytest

BASH = """
eval "$(unitclass completion bash)"
COMP_LINE='unitclass {words}'; COMP_POINT=${{#COMP_LINE}}; COMP_TYPE=9
COMP_WORDS=({array}); COMP_CWORD={last}
complete -p unitclass > /dev/null || exit 3
function=$(complete -p unitclass | sed 's/.*-F \\([^ ]*\\) .*/\\1/')
$function unitclass
printf '%s\\n' "${{COMPREPLY[@]}}"
"""
ZSH = """
autoload -U compinit; compinit -u -D; eval "$(unitclass completion zsh)"
(( $+functions[_python_argcomplete] )) && print -r -- "$_comps[unitclass]"
"""
FISH = "unitclass completion fish | source; complete -C 'unitclass {words}'"


def environment() -> dict[str, str]:
    return os.environ | {"PATH": f"{Path(sys.executable).parent}:{os.environ['PATH']}"}


def shell(name: str, script: str) -> list[str]:
    """Return what the shell printed, a line each."""
    if shutil.which(name) is None:
        pytest.skip(f"{name} is not on this machine")
    ran = subprocess.run([name, "-c", script], capture_output=True, text=True, env=environment(), timeout=60, check=True)
    return [line.strip() for line in ran.stdout.splitlines() if line.strip()]


def bash(words: str) -> list[str]:
    array = ["unitclass", *words.split(" ")]
    return shell("bash", BASH.format(words=words, array=" ".join(f"'{w}'" for w in array), last=len(array) - 1))


def test_bash_completes_commands_options_and_choices():
    assert bash("cl") == ["classify"]
    assert "--workers" in bash("classify --w")
    assert set(bash("classify --regime t")) == {"three-phase", "two-phase"}
    assert set(bash("types l")) == {"list", "learn"}


def test_zsh_takes_the_script_and_binds_it_to_the_program():
    assert shell("zsh", ZSH)


def test_fish_completes_commands_and_options():
    assert [line.split("\t")[0] for line in shell("fish", FISH.format(words="cl"))] == ["classify"]
    assert "--workers" in [line.split("\t")[0] for line in shell("fish", FISH.format(words="classify --w"))]
