#!/usr/bin/python3
"""pages.py SOURCE: holds what is written in several places together.

- the checks: the table of vet (limits.c), the keys of the sheet's [limits] (sheet_keys.c), the table of vet.1 and the
  lists of lopside-sheet.5 have the same names, units and limits; a key that is not vet's is judged by solve or report
- the tour: DEVELOPERS.md names every file of src/*/ by its stem
Prints one line per offence.
"""
import math
import pathlib
import re
import sys

# The check of two figures in different units: caution in % and deg, refusal in standard errors. In the sheet its
# unit is the caution's.
TWO_UNITS = "trial-effect"
# What the lists of lopside-sheet.5 call the units, as they stand in the key table.
UNIT_WORDS = {"In percent": "%", "In deg": "deg", "In s.e.": "s.e.", "In turns": "turns", "In samples": "samples",
              "A plain number": "", "Only none": None}

offences = []


def offend(place, text):
    offences.append(f"{place}: {text}")


def number(text):
    return math.nan if text == "NAN" else float(text)


def checks_of_vet(source):
    """name to (unit, caution, refuse), in the table's order; NaN: no limit, 0: any value trips."""
    text = (source / "src/vet/limits.c").read_text()
    rows = re.findall(r'\[CHECK_(\w+)\]\s*=\s*\{"([^"]+)",\s*"([^"]*)",\s*([^,]+),\s*([^,]+),', text)
    for constant, name, *_ in rows:
        if constant.lower().replace("_", "-") != name:
            offend("limits.c", f"CHECK_{constant} is called {name}")
    return {name: (unit, number(caution), number(refuse)) for _, name, unit, caution, refuse in rows}


def keys_of_limits(source):
    """name to unit; None: the sheet may switch it off, no more."""
    text = (source / "src/sheet/sheet_keys.c").read_text()
    table = re.search(r"struct sheet_key LIMITS\[\]\s*=\s*\{(.*?)\};", text, re.S).group(1)
    return {name: None if unit == "NULL" else unit.strip('"')
            for name, unit in re.findall(r'\{"([^"]+)",\s*0,\s*("[^"]*"|NULL)\}', table)}


def check_keys(source, vet, keys):
    for name, (unit, caution, refuse) in vet.items():
        figures = any(not math.isnan(x) and x > 0 for x in (caution, refuse))
        wanted = ("%" if name == TWO_UNITS else unit) if figures else None
        if name not in keys:
            offend("sheet_keys.c", f"lacks {name}")
        elif keys[name] != wanted:
            offend("sheet_keys.c", f"has {name} in {keys[name]}, limits.c in {wanted}")
    others = "".join(p.read_text() for stage in ("solve", "report") for p in (source / "src" / stage).glob("*.c"))
    for name in keys.keys() - vet.keys():
        if f'"{name}"' not in others:
            offend("sheet_keys.c", f"has {name}, which no stage judges")


def check_vet_page(source, vet):
    text = (source / "src/vet/vet.1").read_text()
    lines = re.search(r"^\.TS\n.*?^check\t[^\n]*\n(.*?)^\.TE", text, re.M | re.S).group(1).splitlines()
    rows = [(line.split("\t") + [""] * 4)[:4] for line in lines]
    if [row[0] for row in rows] != list(vet):
        offend("vet.1", f"has other checks, or another order, than limits.c: "
                        f"{sorted({row[0] for row in rows} ^ vet.keys())}")
    for name, unit, caution, refuse in rows:
        if name not in vet:
            continue
        figures = [re.findall(r"[\d.]+|any", cell) for cell in (caution, refuse)]
        wanted = [[] if math.isnan(x) else ["any"] if x == 0 else [f"{x:g}"] for x in vet[name][1:]]
        if name == TWO_UNITS:  # the caution's two figures are equal
            figures[0] = sorted(set(figures[0]))
            unit = unit.rpartition("; ")[2]
        if figures != wanted:
            offend("vet.1", f"has {name} at {figures}, limits.c at {wanted}")
        if unit.removesuffix("times") != vet[name][0]:
            offend("vet.1", f"has {name} in {unit}, limits.c in {vet[name][0]}")


def check_sheet_page(source, keys):
    text = (source / "src/sheet/lopside-sheet.5").read_text()
    part = text[text.index(".SS [limits]"):]
    part = part[part.index(".PP"):part.index(".SH")]
    part = re.sub(r"^\.(?:PP|BR?|BR)\b *", "", part, flags=re.M).replace("\n", " ")
    told = {}
    for words, names in re.findall(r"(In percent|In deg|In s\.e\.|In turns|In samples|A plain number|Only none) ?: "
                                   r"([a-z, -]+)", part):
        for name in names.split(","):
            told[name.strip()] = UNIT_WORDS[words]
    for name in sorted(told.keys() ^ keys.keys()):
        offend("lopside-sheet.5", f"{'has' if name in told else 'lacks'} {name}, unlike sheet_keys.c")
    for name in told.keys() & keys.keys():
        if told[name] != keys[name]:
            offend("lopside-sheet.5", f"has {name} in {told[name]}, sheet_keys.c in {keys[name]}")


def check_tour(source):
    words = set(re.findall(r"\w+", (source / "DEVELOPERS.md").read_text()))
    stems = {path.stem: path for path in (source / "src").glob("*/*.[ch]")}
    for stem in sorted(stems.keys() - words):
        offend("DEVELOPERS.md", f"does not name {stems[stem].relative_to(source)}")
    return len(stems)


def main():
    source = pathlib.Path(sys.argv[1])
    vet, keys = checks_of_vet(source), keys_of_limits(source)
    count = len(re.findall(r"^    CHECK_(?!COUNT)\w+,$", (source / "src/vet/limits.h").read_text(), re.M))
    if len(vet) != count or count == 0:
        offend("limits.c", f"{len(vet)} rows were found, and {count} checks in limits.h")
    check_keys(source, vet, keys)
    check_vet_page(source, vet)
    check_sheet_page(source, keys)
    if check_tour(source) == 0:
        offend("src", "no file was found")
    for line in offences:
        print(line)
    return bool(offences)


if __name__ == "__main__":
    sys.exit(main())
