#!/usr/bin/python3
"""layers.py SOURCE BUILD: holds the code to its layers.

- a stage's folder includes only base/, stream/, sheet/ and itself
- base includes base; stream includes base; sheet includes base and stream
- a stage's files are its stage file <stage>.c and, where that would grow too long, <stage>_*.c beside it
- kernels (all other files of its folder) see no stream, no options, and never print or exit
- foo.c exports only foo_*, or functions of a struct, enum or kind of record that a header of its folder declares;
  <stage>.c exports stage_* alone, <stage>_part.c only <stage>_part_*
Prints one line per offence.
"""
import pathlib
import re
import subprocess
import sys

STAGES = ["read", "track", "average", "vet", "solve", "report"]
BELOW = {"base": {"base"}, "stream": {"base", "stream"}, "sheet": {"base", "stream", "sheet"}}
BELOW.update({stage: {"base", "stream", "sheet", stage} for stage in STAGES})
# What a kernel must not call: these print or end the process.
LOUD = {"printf", "fprintf", "vprintf", "vfprintf", "puts", "fputs", "putchar", "putc", "fputc", "perror",
        "dprintf", "exit", "_exit", "_Exit", "quick_exit", "abort", "message", "message_no_memory", "stdout",
        "stderr", "stream_write", "stream_pass", "sink_line", "sink_bytes"}
# What a kernel must not include. Presentation works on records: there is no other array or struct to see.
CLOSED = {"stream/stream.h", "stream/records.h", "stream/line.h", "base/options.h", "base/message.h"}
CLOSED_REPORT = CLOSED - {"stream/records.h"}

offences = []


def offend(path, text):
    offences.append(f"{path}: {text}")


def is_stage_file(folder, path):
    """<stage>.c or .h, or <stage>_*: these see records and print."""
    return folder in STAGES and (path.stem == folder or path.stem.startswith(folder + "_"))


def includes(path):
    return re.findall(r'^\s*#\s*include\s+"([^"]+)"', path.read_text(), re.M)


def check_includes(source, folder, path):
    stage_file = is_stage_file(folder, path)
    for name in includes(path):
        parts = name.split("/")
        where = parts[0] if len(parts) > 1 else folder
        if folder in BELOW and where not in BELOW[folder]:
            offend(path.relative_to(source), f"includes {name} of another layer")
        closed = CLOSED_REPORT if folder == "report" else CLOSED
        own_stage = where == folder and is_stage_file(folder, pathlib.Path(parts[-1]))
        if folder in STAGES and not stage_file and (name in closed or own_stage):
            offend(path.relative_to(source), f"is a kernel and includes {name}")


def symbols(build):
    """(folder, stem) to two sets: exported and called names of the object file."""
    objects = {}
    for path in build.glob("src/*/CMakeFiles/*/*.c.o"):
        objects[str(path)] = path.relative_to(build / "src").parts[0], path.name.removesuffix(".c.o")
    found = {key: (set(), set()) for key in objects.values()}
    text = subprocess.run(["nm", "-A", *objects], check=True, capture_output=True, text=True).stdout if objects else ""
    for line in text.splitlines():
        path, _, rest = line.partition(":")
        kind, name = rest.split()[-2:]
        exported, called = found[objects[path]]
        if kind in "TDBRSGVW" and not name.startswith("_"):
            exported.add(name)
        elif kind == "U":
            called.add(name)
    return found


def declared(folder_path):
    """Names of structs and enums in the folder's headers; X_record declares X, too."""
    names = set()
    for header in folder_path.glob("*.h"):
        for name in re.findall(r"\b(?:struct|enum|union)\s+(\w+)\s*\{", header.read_text()):
            names |= {name, re.sub(r"_record$", "", name)}
        names |= {n for n in re.findall(r"^struct (\w+);", header.read_text(), re.M)}
        names |= set(re.findall(r"\b(\w+)_(?:print|parse)\(", header.read_text()))
    return names


def check_symbols(source, found, folder, path):
    exported, called = found.get((folder, path.stem), (set(), set()))
    stage_file = is_stage_file(folder, path)
    name = path.relative_to(source)
    if folder in STAGES and not stage_file:
        for loud in sorted(called & LOUD):
            offend(name, f"is a kernel and calls {loud}")
    if stage_file:
        heads = {"stage"} if path.stem == folder else {path.stem}
    else:
        heads = {path.stem} | declared(path.parent)
    if folder == "desk":
        heads |= {"desk"}
    for symbol in sorted(exported):
        if not any(symbol == h or symbol.startswith(h + "_") for h in heads):
            offend(name, f"exports {symbol}")
    return bool(exported or called)


def main():
    source, build = pathlib.Path(sys.argv[1]), pathlib.Path(sys.argv[2])
    seen, found = 0, symbols(build)
    for path in sorted((source / "src").glob("*/*.[ch]")):
        folder = path.parent.name
        check_includes(source, folder, path)
        if path.suffix == ".c":
            seen += check_symbols(source, found, folder, path)
    for line in offences:
        print(line)
    if seen < len(STAGES):
        print(f"only {seen} object files found under {build}")
    return bool(offences) or seen < len(STAGES)


if __name__ == "__main__":
    sys.exit(main())
