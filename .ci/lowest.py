"""Print pip constraints that pin each dependency of pyproject.toml to its lower bound."""

import tomllib
from pathlib import Path

project = tomllib.loads(Path("pyproject.toml").read_text())["project"]
for requirement in project["dependencies"]:
    print(requirement.replace(">=", "=="))
