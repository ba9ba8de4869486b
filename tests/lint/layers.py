#!/usr/bin/env python3
"""Checks what the layout promises: who may use whom, and what a layer does without.

Prints `ok: NAME` or `FAILED: NAME` with the places, one line a check; ends with status 1 if one failed.
"""

import json
import re
import subprocess
import sys
from pathlib import Path

ROOT = Path(__file__).resolve().parents[2]
NUMERICS = ROOT / "engine/numerics/src"
SERVICE = ROOT / "engine/service/src"
CLIENT = ROOT / "client-example/src"

# Floors of the kernel. A module uses floors below its own; modules of one floor do not know each other.
FLOORS = {
    "model": 0,
    "element": 1, "load": 1,
    "assembly": 2, "check": 2,
    "equilibrium": 3,
    "shape": 4, "motion": 4, "diagnose": 4, "workshop": 4, "site": 4,
    "brief": 5,
}

# Small nets for tests beside the code: part of no floor.
FOR_TESTS = {"test_nets"}

# The kernel is pure and synchronous: crates that would make it otherwise.
NOT_IN_KERNEL = {
    "tokio", "tokio-stream", "tokio-util", "futures", "futures-core", "async-trait", "tonic", "prost", "prost-types",
    "prost-reflect", "hyper", "h2", "http", "tower", "tracing", "log", "serde", "serde_json", "mio", "socket2",
}

TOP_LEVEL = {
    "Cargo.toml", "Cargo.lock", "README.md", "DEVELOPERS.md", "LICENSE", "build.rs",
    "proto", "engine", "client-example", "tests",
}


def code_of(path):
    """Text of a Rust file without comments and without the contents of its strings."""
    text = path.read_text()
    text = re.sub(r'b?r(#*)".*?"\1', '""', text, flags=re.S)
    text = re.sub(r"'(?:\\.|[^\\'])'", "' '", text)
    pattern = re.compile(r'//[^\n]*|/\*.*?\*/|"(?:\\.|[^"\\])*"', re.S)
    # Line ends stay, so that places keep their line numbers.
    return pattern.sub(lambda m: re.sub(r"[^\n]+", '""' if m[0].startswith('"') else "", m[0]), text)


def rust_files(folder):
    return sorted(folder.rglob("*.rs"))


def place(path, text, position):
    return f"{path.relative_to(ROOT)}:{text.count(chr(10), 0, position) + 1}"


def module_path(path):
    """Module path of a file of the kernel, as a list of names."""
    parts = list(path.relative_to(NUMERICS).with_suffix("").parts)
    return [] if parts == ["lib"] else parts[:-1] if parts[-1] == "mod" else parts


def used_modules(path):
    """Top-level modules of the kernel that a file's code names, with the places."""
    text = code_of(path)
    own = module_path(path)
    for match in re.finditer(r"\bcrate::(\w+|\{[^;]*?\}\s*;)", text):
        tail = match[1]
        if not tail.startswith("{"):
            yield tail, place(path, text, match.start())
            continue
        depth = 0
        for part in re.finditer(r"[{}]|(?<![\w:])(\w+)", tail):
            depth += {"{": 1, "}": -1}.get(part[0], 0)
            if part[1] and depth == 1:
                yield part[1], place(path, text, match.start())
    # `super` climbs one module at a time; inside an inline module it starts one lower, which only hides nothing:
    # a chain that reaches the crate's root names a top-level module whichever way it is counted.
    for match in re.finditer(r"\b((?:super::){2,})(\w+)", text):
        climbs = match[1].count("super::")
        inline = text[: match.start()].count("mod tests {") + text[: match.start()].count("mod tests{")
        if climbs - inline >= len(own):
            yield match[2], place(path, text, match.start())


def floors():
    for path in rust_files(NUMERICS):
        own = module_path(path)
        if not own or own[0] in FOR_TESTS:
            continue
        if own[0] not in FLOORS:
            yield f"{path.relative_to(ROOT)}: module {own[0]} has no floor"
            continue
        for used, where in used_modules(path):
            if used != own[0] and used not in FOR_TESTS and FLOORS.get(used, 99) >= FLOORS[own[0]]:
                yield f"{where}: {own[0]} (floor {FLOORS[own[0]]}) uses {used} (floor {FLOORS.get(used, 'none')})"


def normal_dependencies(package, *flags):
    out = subprocess.run(
        ["cargo", "tree", "--locked", "-q", "-e", "normal", "--prefix", "none", "-f", "{p}", "-p", package, *flags],
        cwd=ROOT, check=True, capture_output=True, text=True,
    ).stdout
    return {line.split()[0] for line in out.splitlines() if line.strip()} - {package}


def kernel_is_pure():
    names = normal_dependencies("ropewalk-numerics")
    for name in sorted(names):
        if name in NOT_IN_KERNEL or name.startswith("ropewalk"):
            yield f"ropewalk-numerics depends on {name}"
    forbidden = r"\bstd::(?:fs|net|time|thread|process|env|io)\b|\basync\s+(?:fn|move)\b|\bprintln!|\beprintln!|\brand::"
    for path in rust_files(NUMERICS):
        if "tests" in path.relative_to(NUMERICS).parts or path.name == "tests.rs":
            continue
        text = code_of(path)
        for match in re.finditer(forbidden, text):
            yield f"{place(path, text, match.start())}: {match[0]}"


def contract_stands_alone():
    for name in sorted(normal_dependencies("ropewalk-api")):
        if name.startswith("ropewalk"):
            yield f"ropewalk-api depends on {name}"


def client_sees_the_contract_only():
    for name in sorted(normal_dependencies("ropewalk", "--no-default-features")):
        if name.startswith("ropewalk") and name != "ropewalk-api":
            yield f"without its embedded engine, ropewalk depends on {name}"
    for path in rust_files(CLIENT):
        text = code_of(path)
        for match in re.finditer(r"\bropewalk_numerics\b", text):
            yield f"{place(path, text, match.start())}: {match[0]}"
    users = [path for path in rust_files(CLIENT) if re.search(r"\bropewalk_service\b", code_of(path))]
    if len(users) > 1:
        yield "the engine is started in more than one file: " + ", ".join(str(p.relative_to(ROOT)) for p in users)


def wire_types_stay_in_the_service():
    for path in rust_files(NUMERICS):
        text = code_of(path)
        for match in re.finditer(r"\b(?:ropewalk_api|ropewalk_service|prost|tonic)\b", text):
            yield f"{place(path, text, match.start())}: {match[0]}"


def one_file_names_status_codes():
    for path in rust_files(SERVICE):
        if path.name == "status.rs" or "status" in path.relative_to(SERVICE).parts:
            continue
        # Tests beside the code, which come last in a file, read codes; they choose none.
        text = code_of(path).split("#[cfg(test)]\nmod tests {")[0]
        for match in re.finditer(r"\bCode::[A-Z]\w+|\bStatus::[a-z_]+\(", text):
            if match[0] not in ("Status::code(", "Status::from("):
                yield f"{place(path, text, match.start())}: {match[0]}"


def one_file_knows_the_factorisation():
    for path in rust_files(NUMERICS):
        text = code_of(path)
        if re.search(r"\bfaer\b", text) and path.relative_to(NUMERICS) != Path("equilibrium/linear.rs"):
            # Its floor may be lower than where the layout first drew it: one file all the same.
            users = [p for p in rust_files(NUMERICS) if re.search(r"\bfaer\b", code_of(p))]
            if len(users) > 1:
                yield "faer is used in " + ", ".join(str(p.relative_to(ROOT)) for p in users)
            return


def tracked():
    out = subprocess.run(["git", "ls-files", "-z"], cwd=ROOT, check=True, capture_output=True, text=True).stdout
    return [name for name in out.split("\0") if name]


def top_level_is_fixed():
    for name in sorted({name.split("/")[0] for name in tracked()}):
        if name not in TOP_LEVEL and not name.startswith("."):
            yield f"{name} is not among the fixed top-level entries"


def nothing_is_left_unfinished():
    words = re.compile(r"#\[ignore|\btodo!|\bunimplemented!|\bFIX" r"ME\b|mark\.skip|pytest\.skip")
    for name in tracked():
        path = ROOT / name
        if path.suffix in {".rs", ".py", ".proto"} and path != Path(__file__).resolve() and path.exists():
            text = path.read_text()
            for match in words.finditer(text):
                yield f"{place(path, text, match.start())}: {match[0]}"


def every_paper_is_listed():
    """Each `Name 1999` in the kernel's documentation stands in its list of references, and nothing else does."""
    listed = (ROOT / "engine/numerics/REFERENCES.md").read_text()
    written = "\n".join(path.read_text() for path in rust_files(NUMERICS))
    for entry in re.findall(r"^\| (\w[^|]*?) \|", listed, re.M):
        if entry != "cited as" and entry not in written:
            yield f"{entry} is listed, but no docstring names it"
    citation = re.compile(r"\b([A-Z][\w'’-]+(?:(?:, | & | and |, & )[A-Z][\w'’-]+)*)(?: et al\.)?,? \(?((?:18|19|20)\d\d)\b")
    for path in rust_files(NUMERICS):
        text = path.read_text()
        for line in re.finditer(r"^\s*//.*$", text, re.M):
            for match in citation.finditer(line[0]):
                first = re.split(r", | & | and ", match[1])[0]
                if not any(first in entry and match[2] in entry for entry in listed.splitlines()):
                    yield f"{place(path, text, line.start())}: {match[0]} is not in REFERENCES.md"


def one_profile():
    metadata = json.loads(subprocess.run(
        ["cargo", "metadata", "--locked", "--no-deps", "--format-version", "1"],
        cwd=ROOT, check=True, capture_output=True, text=True,
    ).stdout)
    members = {package["name"] for package in metadata["packages"]}
    defaults = {package["name"] for package in metadata["packages"]
                if package["id"] in metadata["workspace_default_members"]}
    for name in sorted(members - defaults):
        yield f"{name} is not a default member: the README's commands would not find its binary"


CHECKS = [
    ("kernel floors", floors),
    ("the kernel is pure", kernel_is_pure),
    ("the contract stands alone", contract_stands_alone),
    ("the client sees the contract only", client_sees_the_contract_only),
    ("generated types stay in the service", wire_types_stay_in_the_service),
    ("one file names status codes", one_file_names_status_codes),
    ("one file knows the factorisation", one_file_knows_the_factorisation),
    ("every member is a default member", one_profile),
    ("the top level is fixed", top_level_is_fixed),
    ("nothing is left unfinished", nothing_is_left_unfinished),
    ("every paper is listed", every_paper_is_listed),
]


def main():
    failed = 0
    for name, check in CHECKS:
        places = list(check())
        print(f"{'FAILED' if places else 'ok'}: {name}")
        for line in places:
            print(f"    {line}")
        failed += bool(places)
    return 1 if failed else 0


if __name__ == "__main__":
    sys.exit(main())
